import type { ComponentChild } from 'preact';
import { type Look, type OpenedPage, PAGES, type PageEntry, type PageTools } from './pages.js';

/** Which page is in front, and the pages that were opened so far. */
export class PageBook {
  current: PageEntry = PAGES[0];
  private readonly opened = new Map<string, OpenedPage>();
  private failed = false;
  private turns = 0;

  constructor(private readonly tools: PageTools) {}

  /** Goes to the page that the address names; its code is loaded when it is first asked for. */
  async turnTo(hash: string): Promise<void> {
    const [name = '', ...rest] = hash.replace(/^#/, '').split('/');
    const turn = ++this.turns;
    const before = this.current;
    this.current = PAGES.find((page) => page.name === name) ?? PAGES[0];
    this.failed = false;
    if (before !== this.current) this.opened.get(before.name)?.hidden?.();
    this.tools.touch();
    const page = await this.load(this.current);
    if (turn !== this.turns) return;
    page?.shown?.(rest.join('/'));
    this.tools.touch();
  }

  /** The page in front; undefined for the Run page, which is drawn without being loaded. */
  view(look: Look): ComponentChild {
    if (!this.current.load) return undefined;
    const page = this.opened.get(this.current.name);
    if (page) return page.view(look);
    return <Waiting title={this.current.title} failed={this.failed} />;
  }

  get unsaved(): boolean {
    return [...this.opened.values()].some((page) => page.unsaved);
  }

  private async load({ name, load }: PageEntry): Promise<OpenedPage | undefined> {
    if (!load) return undefined;
    try {
      const { open } = await load();
      const page = this.opened.get(name) ?? open(this.tools);
      this.opened.set(name, page);
      return page;
    } catch {
      // Most often: Lapwing was updated meanwhile, and the old part is no longer served.
      if (this.current.name === name) this.failed = true;
      return undefined;
    }
  }
}

function Waiting({ title, failed }: { title: string; failed: boolean }) {
  return (
    <main class="loading-page">
      {failed ? (
        <div class="loading" role="alert">
          <p>
            The {title} page could not be loaded. Is the service there? Then load the page anew.
          </p>
          <button type="button" onClick={() => location.reload()}>
            Load anew
          </button>
        </div>
      ) : (
        <p class="loading">The {title} page is loading.</p>
      )}
    </main>
  );
}
