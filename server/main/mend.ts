import { Command } from 'commander';
import { type Closed, closeRecord } from '../session/closeRecord.js';
import { describeTroubles } from '../session/record/recordState.js';
import { progressBar } from './progressBar.js';

type Note = NonNullable<Closed['replay']>;

/** `lapwing mend SESSION`: closes a record that was left open or torn. */
export function mendCommand(): Command {
  return new Command('mend')
    .description('close a record that a crash left open, say what is missing, and replay the rest')
    .argument('<session>', 'the session folder')
    .option('--json', 'print the result as JSON')
    .action(async (folder: string, flags: { json?: boolean }) => {
      const bar = progressBar('mending');
      const { finished, replay } = await closeRecord(folder, (done) => bar.show(done));
      bar.clear();
      const { state, bytes, originals } = finished;
      const { messages, lastInput } = state;
      const missing = describeTroubles(state);
      if (flags.json) {
        const result = { state: state.state, messages, lastInput, bytes, missing, originals };
        process.stdout.write(`${JSON.stringify({ ...result, replay: replay ?? null })}\n`);
        return;
      }
      const lines = [
        `${messages} messages up to input ${lastInput}, ${(bytes / 1e6).toFixed(1)} MB`,
        ...(missing.length === 0 ? ['nothing is missing'] : missing),
        ...originals.map((name) => `kept as it was found: ${name}`),
        ...(replay === undefined ? [] : [replayInWords(replay)]),
      ];
      process.stdout.write(`${lines.join('\n')}\n`);
    });
}

function replayInWords({ identical, inputs, decisions, failed, difference }: Note): string {
  if (identical) return `replayed: ${decisions} decisions from ${inputs} inputs, all identical`;
  return `replayed: ${failed ?? `different at input ${difference?.input}`}; see \`lapwing replay\``;
}
