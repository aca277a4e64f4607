/** Waits until `holds`, looking every few milliseconds; fails after `mostMs`. */
export async function until(what: string, holds: () => boolean, mostMs = 15_000): Promise<void> {
  const end = performance.now() + mostMs;
  while (!holds()) {
    if (performance.now() > end) throw new Error(`waited ${mostMs} ms in vain for: ${what}`);
    await new Promise((resolve) => setTimeout(resolve, 3));
  }
}
