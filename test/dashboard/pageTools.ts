/** What tests of every page do with it: go by keyboard, and have it examined. */
import axe from 'axe-core';
import type { Page } from 'playwright-core';

/** Presses Tab until the focus is on what is named so, in an editor's shadow root too. */
export async function tabTo(page: Page, name: RegExp, key = 'Tab', most = 80): Promise<void> {
  for (let n = 0; n < most; n++) {
    await page.keyboard.press(key);
    const there = await page.evaluate(() => {
      let active = document.activeElement as HTMLElement | null;
      while (active?.shadowRoot?.activeElement) {
        active = active.shadowRoot.activeElement as HTMLElement;
      }
      const label = (active as HTMLInputElement | null)?.labels?.[0]?.textContent;
      return (active?.getAttribute('aria-label') ?? label ?? active?.textContent ?? '').trim();
    });
    if (name.test(there)) return;
  }
  throw new Error(`${key} never came to ${name}`);
}

/** What axe has against the page as it is, in each theme. The page's policy must let axe in. */
export async function axeFinds(page: Page): Promise<string[]> {
  await page.evaluate(axe.source);
  const found: string[] = [];
  for (const theme of ['Dark', 'Red', 'Light']) {
    await page.getByText(theme, { exact: true }).click();
    found.push(
      ...(await page.evaluate(async (name) => {
        const run = (window as unknown as { axe: typeof axe }).axe.run;
        const tags = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];
        const { violations } = await run(document, { runOnly: tags });
        return violations.map(
          (one) => `${name}: ${one.id}: ${one.nodes.map((node) => node.html).join(' | ')}`,
        );
      }, theme)),
    );
  }
  return found;
}
