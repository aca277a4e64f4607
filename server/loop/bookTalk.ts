import type { Logger } from 'pino';
import { askBefore, noticeFor, tellBegan, tellEnded } from '../animals/askBook.js';
import type { AnimalBefore } from '../session/description.js';
import { waterTodayNl } from '../session/store.js';

/** What a session is to know of its animal before it begins. */
export interface AnimalAndWater {
  readonly animal?: AnimalBefore;
  /** All that it was given today, as far as the book, or else this rig's records, know. */
  readonly waterTodayNl: number;
}

/** How a rig's loop speaks with the animals folder: always through a process of its own. */
export class BookTalk {
  constructor(
    private readonly rig: string,
    private readonly folder: string | undefined,
    private readonly recordFolder: string,
    private readonly log: Logger,
    private readonly notice: (text: string) => void,
  ) {}

  /** @throws LapwingError ANIMALS_AGAINST unless there is a reason to begin despite what is against it */
  async before(subject: string, despite: string | undefined): Promise<AnimalAndWater> {
    const { rig, folder, recordFolder } = this;
    const fromRecords = () => waterTodayNl(recordFolder, subject, new Date());
    if (folder === undefined) return { waterTodayNl: fromRecords() };
    const found = await askBefore({ folder, subject, rig, recordFolder }, despite);
    const { animal, hadTodayUl } = found;
    return {
      animal,
      waterTodayNl: hadTodayUl === undefined ? fromRecords() : Math.round(hadTodayUl * 1_000),
    };
  }

  began(sessionFolder: string, subject: string, animal: AnimalBefore | undefined): void {
    const notice = noticeFor(subject, animal);
    if (notice !== undefined) this.notice(notice);
    if (animal?.kept) void this.#told(tellBegan(sessionFolder), sessionFolder);
  }

  /** Files what the session gave; a record with holes still holds most of it. */
  ended(sessionFolder: string): Promise<void> {
    if (this.folder === undefined) return Promise.resolve();
    return this.#told(tellEnded(sessionFolder), sessionFolder);
  }

  /** A book that cannot be told now is told before the animal's next session on this rig. */
  #told(telling: Promise<void>, folder: string): Promise<void> {
    return telling.catch((error: Error) =>
      this.log.error({ folder }, `the water book was not told: ${error.message}`),
    );
  }
}
