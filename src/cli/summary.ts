import { checkText } from "../report/check-text.js";
import { marginText } from "../report/margin-text.js";
import { tuneText } from "../report/tune-text.js";
import type { CommandResult, EmptyResult } from "./job.js";

/** What a command prints for people. */
export function summaryText(result: CommandResult | EmptyResult): string {
  if ("before" in result) return tuneText(result);
  if ("margin" in result) return marginText(result);
  if ("effort" in result) return checkText(result);
  return `${result.title}\nINTERRUPTED before a first answer was known\n`;
}
