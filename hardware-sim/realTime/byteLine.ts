/** A cable as the simulated board sees it: something to write to, and something that calls back. */
export interface ByteLine {
  /** What a host would put into its rig file. */
  readonly port: string;
  /** Sends what fits now; the rest is lost, as on a line that nobody reads. */
  write(bytes: Uint8Array): void;
  /** Stops reading, or goes on; what comes meanwhile stays in the kernel. */
  pause(paused: boolean): void;
  unplug(): void;
  /** Plugs in again. @returns the port, which may be another one now */
  replug(): Promise<string>;
}
