/** Marks that have no words yet are kept so many. */
const MOST_OPEN = 20;

/** A moment that the operator marked: where and when the key was pressed. */
export interface MarkMade {
  readonly mark: number;
  /** Extended board time, microseconds. */
  readonly boardUs: number;
  readonly lap: number;
  /** null while position is unknown. */
  readonly positionCm: number | null;
}

/** Notes stamped at the press of a key and put into words later. */
export class Marks {
  #last = 0;
  #open: MarkMade[] = [];

  /** Those without words, oldest first. */
  get open(): readonly MarkMade[] {
    return this.#open;
  }

  make(at: Omit<MarkMade, 'mark'>): MarkMade {
    const made = { mark: ++this.#last, ...at };
    this.#open.push(made);
    if (this.#open.length > MOST_OPEN) this.#open.shift();
    return made;
  }

  /** The mark that a note puts into words; undefined where there is none of that number. */
  word(mark: number | undefined): MarkMade | undefined {
    const found = this.#open.find((one) => one.mark === mark);
    if (found !== undefined) this.#open = this.#open.filter((one) => one !== found);
    return found;
  }
}
