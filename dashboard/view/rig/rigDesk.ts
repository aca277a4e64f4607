/** What the Rig page does: asks the service, and keeps what it was told. */
import type { GuideTold, PortsTold, RigTold } from '../../../server/web/rig/rigMessages.js';
import { fixed } from '../../model/format.js';
import { Strip } from '../../model/strip.js';
import type { Told } from '../../stream/ask.js';
import { type RigApi, rigApi } from '../../stream/rigApi.js';

const STRIP_MS = 125;
const GUIDE_MS = 250;
/** After what failed, and while no guide goes on. */
const CALM_MS = 2_000;

export interface Notice {
  readonly kind: 'good' | 'bad';
  readonly text: string;
  readonly remedy: string;
}

export class RigDesk {
  rig: RigTold | undefined;
  ports: PortsTold | undefined;
  guide: GuideTold = { state: 'none' };
  notice: Notice | undefined;
  /** Why the strip shows nothing; empty while it does. */
  benchTrouble = '';
  readonly strip = new Strip();
  /** Something new for the strip to draw. */
  onStrip: () => void = () => {};
  private inFront = false;
  private after = 0;
  private stripTimer: ReturnType<typeof setTimeout> | undefined;
  private guideTimer: ReturnType<typeof setTimeout> | undefined;

  constructor(
    private readonly touch: () => void,
    private readonly api: RigApi = rigApi,
  ) {}

  shown(): void {
    if (this.inFront) return;
    this.inFront = true;
    void this.look();
    void this.lookAtPorts();
    void this.followBench();
    void this.followGuide();
  }

  hidden(): void {
    this.inFront = false;
    clearTimeout(this.stripTimer);
    clearTimeout(this.guideTimer);
  }

  async look(): Promise<void> {
    const told = await this.api.rig();
    if (told.done) this.rig = told.value;
    else this.tell(told);
    this.touch();
  }

  async lookAtPorts(): Promise<void> {
    const told = await this.api.ports();
    if (told.done) this.ports = told.value;
    this.touch();
  }

  /** One pulse; what became of it is said. */
  async attempt(output: string, widthMs: number, into: 'vial' | 'spout'): Promise<void> {
    const told = await this.api.attempt({ output, widthMs, into });
    if (told.done) {
      const { onUs } = told.value.tried;
      const text = `${output} was on for ${fixed(onUs / 1000, 2)} ms, by the board's word.`;
      this.notice = { kind: 'good', text, remedy: '' };
    } else {
      this.tell(told);
    }
    this.touch();
  }

  async begin(guide: string, of = ''): Promise<void> {
    this.notice = undefined;
    const told = await (guide === 'preflight' ? this.api.preflight() : this.api.begin(guide, of));
    this.took(told);
  }

  async answer(number: number, answers: Readonly<Record<string, number | string>>): Promise<void> {
    this.took(await this.api.answer(number, answers));
  }

  /** Stops the guide, or clears away one that has ended. */
  async stop(): Promise<void> {
    const told = await this.api.stop();
    if (!told.done) this.tell(told);
    await this.lookAtGuide();
    if (this.guide.state === 'none') void this.look();
  }

  async use(name: string): Promise<void> {
    const told = await this.api.use(name);
    if (told.done) {
      const text = `${name} is in force now.`;
      this.notice = { kind: 'good', text, remedy: 'The rig file as it was is beside it, as .bak.' };
    } else {
      this.tell(told);
    }
    await this.look();
  }

  dismiss(): void {
    this.notice = undefined;
    this.touch();
  }

  private took(told: Told<GuideTold>): void {
    if (told.done) this.setGuide(told.value);
    else this.tell(told);
    this.touch();
    clearTimeout(this.guideTimer);
    this.guideTimer = setTimeout(() => void this.followGuide(), GUIDE_MS);
  }

  private setGuide(told: GuideTold): void {
    const ended = told.state === 'done' && this.guide.state !== 'done';
    this.guide = told;
    if (ended) void this.look();
  }

  private async lookAtGuide(): Promise<void> {
    const told = await this.api.guide();
    if (told.done) this.setGuide(told.value);
    this.touch();
  }

  private async followGuide(): Promise<void> {
    await this.lookAtGuide();
    if (!this.inFront) return;
    const goesOn = this.guide.state === 'going' || this.guide.state === 'asking';
    clearTimeout(this.guideTimer);
    this.guideTimer = setTimeout(() => void this.followGuide(), goesOn ? GUIDE_MS : CALM_MS);
  }

  private async followBench(): Promise<void> {
    const told = await this.api.bench(this.after);
    if (!this.inFront) return;
    if (told.done) {
      const { now, items, last } = told.value;
      this.after = last;
      this.strip.take(now, items, performance.now());
      if (this.benchTrouble !== '') {
        this.benchTrouble = '';
        this.touch();
      }
      this.onStrip();
    } else {
      this.benchTrouble = `${told.text} ${told.remedy}`;
      this.touch();
    }
    clearTimeout(this.stripTimer);
    this.stripTimer = setTimeout(() => void this.followBench(), told.done ? STRIP_MS : CALM_MS);
  }

  private tell({ text, remedy }: { readonly text: string; readonly remedy: string }): void {
    this.notice = { kind: 'bad', text, remedy };
  }
}
