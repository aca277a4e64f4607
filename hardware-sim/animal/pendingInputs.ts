export interface PendingInput {
  us: number;
  input: number;
  level: 0 | 1;
}

/** Changes of inputs that are already bound to happen (a contact's end, a bounce), by time. */
export class PendingInputs {
  nextUs = Number.POSITIVE_INFINITY;
  readonly #list: PendingInput[] = [];

  add(us: number, input: number, level: 0 | 1): void {
    let at = this.#list.length;
    while (at > 0 && this.#list[at - 1]!.us > us) at--;
    this.#list.splice(at, 0, { us, input, level });
    this.nextUs = this.#list[0]!.us;
  }

  /** Takes the first out; only when `nextUs` has come. */
  take(): PendingInput {
    const first = this.#list.shift()!;
    this.nextUs = this.#list[0]?.us ?? Number.POSITIVE_INFINITY;
    return first;
  }
}
