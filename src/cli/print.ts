/** Writes to standard output and waits until it has been taken; a reader that has gone away is no fault. */
export async function printText(text: string): Promise<void> {
  await new Promise<void>((resolve, reject) => {
    const ended = (error?: Error | null): void => {
      if (error === undefined || error === null || isGone(error)) resolve();
      else reject(error);
    };
    process.stdout.once("error", ended);
    process.stdout.write(text, ended);
  });
}

function isGone(error: Error): boolean {
  return "code" in error && error.code === "EPIPE";
}
