import { defineConfig } from "vitest/config";

const long = "tests/**/*.long.test.ts";
const exclude = [long];

export default defineConfig({
  root: new URL("..", import.meta.url).pathname,
  test: {
    testTimeout: 120_000,
    projects: [
      { extends: true, test: { name: "unit", include: ["tests/unit/**/*.test.ts"], exclude } },
      { extends: true, test: { name: "references", include: ["tests/references/**/*.test.ts"], exclude } },
      { extends: true, test: { name: "end-to-end", include: ["tests/end-to-end/**/*.test.ts"], exclude } },
      // Minutes to hours: `npm run test:long`.
      { extends: true, test: { name: "long", include: [long] } },
    ],
  },
});
