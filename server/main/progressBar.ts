/** Shows a share done on a terminal; elsewhere, and in the first second, says nothing. */
export function progressBar(what: string): { show(done: number): void; clear(): void } {
  const { stderr } = process;
  const beganMs = Date.now();
  let shown = -1;
  return {
    show(done) {
      const percent = Math.floor(done * 100);
      if (!stderr.isTTY || percent === shown || Date.now() - beganMs < 1_000) return;
      shown = percent;
      const full = Math.round(done * 30);
      stderr.write(`\r${what} [${'#'.repeat(full)}${' '.repeat(30 - full)}] ${percent} %`);
    },
    clear() {
      if (shown >= 0) stderr.write(`\r${' '.repeat(what.length + 42)}\r`);
    },
  };
}
