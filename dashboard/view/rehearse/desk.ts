/** What the Rehearse page does: asks the service, and keeps what it was told. */
import {
  emptyRehearse,
  fileNameOf,
  isChanged,
  NEW_TEXT,
  type Rehearse,
} from '../../model/rehearse.js';
import { type RulesApi, rulesApi } from '../../stream/rulesApi.js';

/** A pause in typing after which the text is checked. */
export const CHECK_AFTER_MS = 200;
const POLL_MS = 300;
const AGAIN_MS = 1500;

export class Desk {
  readonly state: Rehearse = emptyRehearse();
  /** Grows whenever another text was put on the desk: the editor is made anew. */
  opened = 0;
  /** Told the newest problems, and where the cursor is to go; set by the editor that is shown. */
  onChecked: () => void = () => {};
  onGoTo: (offset: number) => void = () => {};
  onFocus: () => void = () => {};
  private checkTimer: ReturnType<typeof setTimeout> | undefined;
  private asked = 0;
  private polling = false;

  constructor(
    private readonly touch: () => void,
    private readonly api: RulesApi = rulesApi,
  ) {}

  /** Lists the files and opens the first one, unless something is on the desk already. */
  async start(preferred?: string): Promise<void> {
    if (this.opened > 0) return;
    this.opened = 1;
    const told = await this.api.list();
    if (told.done) {
      this.state.files = told.value.files;
      this.state.rig = told.value.rig;
    } else this.say(told, 'The rules files cannot be listed');
    const { files } = this.state;
    const first = preferred && files.includes(preferred) ? preferred : files[0];
    if (first === undefined) this.startNew();
    else await this.open(first);
    void this.poll();
  }

  async open(path: string): Promise<void> {
    const told = await this.api.open(path);
    if (!told.done) return this.say(told, `${path} was not opened`);
    // CodeMirror counts in lines ended by LF; the byte-order mark is no part of the text.
    const text = told.value.text.replace(/^\ufeff/, '').replace(/\r\n/g, '\n');
    this.put(text, path, told.value.version);
  }

  startNew(): void {
    this.put(NEW_TEXT, undefined, undefined);
    this.state.savedText = '';
    this.touch();
  }

  /** Saves under the name that is open, or under another, which must be new. */
  async save(typed?: string): Promise<void> {
    const { state } = this;
    const path = typed === undefined ? state.path : fileNameOf(typed);
    if (path === undefined || path === '') {
      state.notice = { kind: 'bad', text: 'Not saved: it has no name yet.', remedy: 'Type one.' };
      return this.touch();
    }
    const version = path === state.path ? state.version : undefined;
    const { text } = state;
    const told = await this.api.save({ path, text, ...(version ? { version } : {}) });
    if (!told.done) return this.say(told, `${path} was not saved`);
    Object.assign(state, { path, version: told.value.version, savedText: text });
    if (!state.files.includes(path)) state.files = [...state.files, path].sort();
    state.notice = { kind: 'good', text: `Saved as ${path}.`, remedy: '' };
    this.touch();
  }

  /** The editor's text is another. */
  changed(text: string): void {
    this.state.text = text;
    this.state.checking = true;
    this.checkSoon(CHECK_AFTER_MS);
    this.touch();
  }

  cursor(offset: number): void {
    if (this.state.cursor === offset) return;
    this.state.cursor = offset;
    this.touch();
  }

  goTo(offset: number): void {
    this.onGoTo(offset);
  }

  async rehearse(): Promise<void> {
    const { state } = this;
    const { text, path, form } = state;
    const told = await this.api.rehearse({ text, ...form, ...(path ? { path } : {}) });
    if (!told.done) return this.say(told, 'Not rehearsed');
    state.notice = undefined;
    state.topLap = undefined;
    state.rehearsedText = text;
    const { number } = told.value;
    const { runs } = form;
    const mostS = form.minutes * 60;
    state.rehearsal = { state: 'running', number, sessionS: 0, mostS, runs, runsDone: 0 };
    this.touch();
    await this.poll();
  }

  async cancel(): Promise<void> {
    await this.api.cancel();
    await this.poll();
  }

  dismiss(): void {
    this.state.notice = undefined;
    this.touch();
  }

  refresh(): void {
    this.touch();
  }

  get unsaved(): boolean {
    return this.opened > 0 && isChanged(this.state);
  }

  private put(text: string, path: string | undefined, version: string | undefined): void {
    const { state } = this;
    Object.assign(state, { text, path, version, savedText: text, cursor: 0, check: undefined });
    state.notice = undefined;
    state.checking = true;
    this.opened++;
    this.checkSoon(0);
    this.touch();
  }

  private checkSoon(ms: number): void {
    clearTimeout(this.checkTimer);
    this.checkTimer = setTimeout(() => void this.check(), ms);
  }

  private async check(): Promise<void> {
    const asked = ++this.asked;
    const { text, path } = this.state;
    const told = await this.api.check(text, path);
    // A newer text is being typed or asked about: its answer is the one to show.
    if (asked !== this.asked || text !== this.state.text) return;
    if (!told.done) {
      this.say(told, 'Not checked');
      // Asked too often, or the service is being started again.
      if (told.status === 0 || told.status === 429) this.checkSoon(AGAIN_MS);
      return;
    }
    if (this.state.notice?.text.startsWith('Not checked')) this.state.notice = undefined;
    this.state.check = told.value;
    this.state.checking = false;
    this.onChecked();
    this.touch();
  }

  /** Follows a rehearsal until it has ended. */
  private async poll(): Promise<void> {
    if (this.polling) return;
    this.polling = true;
    try {
      for (;;) {
        const told = await this.api.rehearsal();
        if (!told.done) return this.say(told, 'The rehearsal cannot be followed');
        this.state.rehearsal = told.value;
        this.touch();
        if (told.value.state !== 'running') return;
        await new Promise((resolve) => setTimeout(resolve, POLL_MS));
      }
    } finally {
      this.polling = false;
    }
  }

  private say(told: { readonly text: string; readonly remedy: string }, what: string): void {
    this.state.notice = { kind: 'bad', text: `${what}: ${told.text}`, remedy: told.remedy };
    this.touch();
  }
}
