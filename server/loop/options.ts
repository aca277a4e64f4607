/** What the launcher tells the loop process, as one JSON argument. */
export interface LoopOptions {
  readonly rigPath: string;
  /** Instead of the rig file's port: where the simulated rig is found. */
  readonly port?: string;
  /** Instead of the rig file's folders. */
  readonly recordFolder?: string;
  readonly rulesFolder?: string;
  readonly animalsFolder?: string;
  /** A session to begin as soon as the board answers. */
  readonly begin?: BeginOptions;
  /** Go on with the session that a loop left when it died; without it, one left over is refused. */
  readonly resume?: boolean;
  /** Leave when that session has ended and its record is closed. */
  readonly exitWhenEnded: boolean;
}

export interface BeginOptions {
  /** Absolute path of the rules file. */
  readonly rulesPath: string;
  readonly subject: string;
  readonly experimenter: string;
  readonly protocolNumber?: string;
  /** Counted on from the subject's last where nothing is said. */
  readonly sessionNumber?: number;
  /** The seed of every draw; made up and recorded where nothing is said. */
  readonly seed?: string;
  /** Why it is to begin whatever the animals folder or the pre-flight has against it. */
  readonly despite?: string;
}

/** What the loop process tells its launcher over their IPC channel. */
export type LoopReport =
  | { readonly report: 'ready' }
  | { readonly report: 'session began'; readonly folder: string }
  | { readonly report: 'session ended'; readonly folder: string; readonly reason: string }
  /** Something that whoever began the session should know. */
  | { readonly report: 'notice'; readonly text: string }
  /** It cannot run at all, and starting it again would not help. */
  | {
      readonly report: 'failed';
      readonly code: string;
      readonly message: string;
      readonly remedy: string;
    };
