import type { ExportFormat } from './recordsMessages.js';

/** What the web process tells the process that works on records; folders are absolute. */
export type RecordsTask =
  | { readonly do: 'summary' | 'report' | 'replay' | 'mend'; readonly folder: string }
  | { readonly do: 'export'; readonly folder: string; readonly to: ExportFormat }
  | {
      readonly do: 'what if';
      readonly folder: string;
      /** As the page named it, and where it is. */
      readonly rules: string;
      readonly rulesPath: string;
    }
  | { readonly do: 'learning'; readonly folders: readonly string[] };
