import { defineConfig } from "vitest/config";

export default defineConfig({
  root: new URL("..", import.meta.url).pathname,
  test: {
    testTimeout: 120_000,
    projects: [
      { extends: true, test: { name: "unit", include: ["tests/unit/**/*.test.ts"] } },
      { extends: true, test: { name: "references", include: ["tests/references/**/*.test.ts"] } },
      { extends: true, test: { name: "end-to-end", include: ["tests/end-to-end/**/*.test.ts"] } },
    ],
  },
});
