import type { BoardLine } from './boardLine.js';
import { ConformanceHost } from './conformanceHost.js';
import { NotConforming } from './frameHost.js';
import { SCRIPTS, type Script } from './scripts.js';

export interface ScriptResult {
  readonly script: Script;
  readonly result: 'conforms' | 'does not' | 'not possible here';
  /** What was expected and not found, or what the bench lacks. */
  readonly why?: string;
}

/** One script on one board; the host is made by the caller, so that its ids go on. */
export async function runScript(host: ConformanceHost, script: Script): Promise<ScriptResult> {
  const lacks = (script.needs ?? []).filter((need) => host.line[need] === undefined);
  if (lacks.length > 0) return { script, result: 'not possible here', why: lacks.join(', ') };
  try {
    await script.run(host);
    return { script, result: 'conforms' };
  } catch (error) {
    if (!(error instanceof NotConforming)) throw error;
    return { script, result: 'does not', why: error.message };
  }
}

/** The whole suite on one board. */
export async function runSuite(
  line: BoardLine,
  told: (result: ScriptResult) => void,
): Promise<readonly ScriptResult[]> {
  const host = new ConformanceHost(line);
  const results: ScriptResult[] = [];
  for (const script of SCRIPTS) {
    const result = await runScript(host, script);
    told(result);
    results.push(result);
  }
  return results;
}
