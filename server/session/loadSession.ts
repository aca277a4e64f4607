import path from 'node:path';
import { armOf } from './blinding/arms.js';
import type { SessionSetup } from './core/sessionCore.js';
import { readDescription, type SessionDescription } from './description.js';
import { type PreparedRules, prepareRules } from './prepare.js';
import { readRig } from './rig/readRig.js';
import type { Rig } from './rig/rig.js';

/** A session folder, read far enough to feed its record through the engine again. */
export interface LoadedSession {
  readonly folder: string;
  readonly description: SessionDescription;
  readonly rig: Rig;
  readonly rules: PreparedRules;
  readonly setup: SessionSetup;
}

/**
 * Reads a session's description and its own copies of the rig and rules files.
 * @param rulesPath another rules file to run in place of the session's own
 * @throws LapwingError RECORD_DESCRIPTION_BAD, RULES_INVALID, or the rig file's
 */
export function loadSession(folder: string, rulesPath?: string): LoadedSession {
  const description = readDescription(folder);
  const rig = readRig(path.join(folder, 'rig.yaml'));
  const rules = prepareRules(rulesPath ?? path.join(folder, 'rules.yaml'), rig);
  const { seed, waterEarlierUl } = description;
  const waterTodayNl = Math.round((waterEarlierUl ?? 0) * 1_000);
  const arm = armOf(description.blinding);
  const setup = {
    ...{ rig, program: rules.program, title: rules.file.title, seed, waterTodayNl },
    ...(arm === undefined ? {} : { arm }),
  };
  return { folder, description, rig, rules, setup };
}
