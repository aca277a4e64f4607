/** What the Animals page does: asks the service, and keeps what it was told. */
import type { AnimalsAsk } from '../../../server/web/animals/animalsMessages.js';
import { type Animals, emptyAnimals } from '../../model/animals.js';
import { type AnimalsApi, animalsApi } from '../../stream/animalsApi.js';

const LIST_MS = 10_000;
const NO_FOLDER = {
  text: 'The rig file names no animals folder, so weights and water are in no book here.',
  remedy: 'Add `animals: FOLDER` to the rig file, the same folder for every rig of the group.',
};

/** What looks mistyped is answered so; it may be sent again by whoever is sure. */
const DOUBTED = 422;

export class AnimalsDesk {
  readonly state: Animals = emptyAnimals();
  private inFront = false;
  private timer: ReturnType<typeof setTimeout> | undefined;

  constructor(
    private readonly touch: () => void,
    private readonly api: AnimalsApi = animalsApi,
  ) {}

  /** The page is in front, with this animal open, or none. */
  shown(name: string): void {
    this.inFront = true;
    if (name !== (this.state.open ?? '')) {
      const open = name === '' ? undefined : name;
      Object.assign(this.state, { open, animal: undefined, form: 'none', doubted: undefined });
      this.state.notice = undefined;
    }
    void this.refresh();
  }

  hidden(): void {
    this.inFront = false;
    clearTimeout(this.timer);
  }

  /** Writes an entry down; true when it is there. */
  async write(entry: AnimalsAsk): Promise<boolean> {
    if (this.state.busy) return false;
    this.state.busy = true;
    this.touch();
    const told = await this.api.write(entry);
    this.state.busy = false;
    const unlikely = !told.done && told.status === DOUBTED && /now \d|target is/.test(told.text);
    this.state.doubted = unlikely ? entry : undefined;
    this.state.notice = told.done
      ? undefined
      : { kind: 'bad', text: `Not written down: ${told.text}`, remedy: told.remedy };
    if (told.done) {
      Object.assign(this.state, { form: 'none', written: this.state.written + 1 });
    }
    await this.refresh();
    return told.done;
  }

  /** The entry that looked mistyped is right. */
  insist(): void {
    const { doubted } = this.state;
    if (doubted?.do === 'weigh' || doubted?.do === 'water') {
      void this.write({ ...doubted, sure: true });
    }
  }

  setForm(form: Animals['form']): void {
    this.state.form = form;
    this.touch();
  }

  dismiss(): void {
    Object.assign(this.state, { notice: undefined, doubted: undefined });
    this.touch();
  }

  private async refresh(): Promise<void> {
    clearTimeout(this.timer);
    const { open } = this.state;
    const [list, animal] = await Promise.all([
      this.api.list(),
      open === undefined ? undefined : this.api.animal(open),
    ]);
    const isKept = list.done && list.value.folder !== null;
    this.state.list = isKept ? list.value : undefined;
    this.state.trouble = isKept ? undefined : list.done ? NO_FOLDER : list;
    if (open === this.state.open) {
      this.state.animal = animal?.done ? animal.value : undefined;
      if (animal && !animal.done && list.done) {
        this.state.notice = { kind: 'bad', text: animal.text, remedy: animal.remedy };
      }
    }
    this.touch();
    clearTimeout(this.timer);
    if (this.inFront) this.timer = setTimeout(() => void this.refresh(), LIST_MS);
  }
}
