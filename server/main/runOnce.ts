import { individual } from '../../hardware-sim/animal/individual.js';
import type { AnimalParameters } from '../../hardware-sim/animal/parameters.js';
import type { Latency } from '../rehearse/latency.js';
import { RunCollector, type RunResult } from '../rehearse/runResult.js';
import type { RulesFile } from '../rules/ast.js';
import { compile } from '../rules/engine/compile.js';
import { murmur3 } from '../rules/engine/hash.js';
import type { Program } from '../rules/engine/program.js';
import { rehearse } from '../session/rehearsal.js';
import { factsOf, type Rig } from '../session/rig/rig.js';
import { simulatedRigFor } from './simulatedRigFor.js';

/** What many runs have in common: plain data, as it is sent to the threads that run them. */
export interface RunsSetting {
  readonly rig: Rig;
  readonly file: RulesFile;
  /** The seed of everything: draws, animals, latencies. */
  readonly seed: string;
  readonly animal: AnimalParameters;
  readonly trained: boolean;
  /** A session that does not end by itself is ended after this long. */
  readonly minutes: number;
  /** Every frame of a board at 1 kHz, at five times the cost. */
  readonly everyFrame: boolean;
  readonly latency: Latency;
}

/** Runs sessions of one setting; the rules are compiled once. */
export class Runs {
  readonly #program: Program;

  constructor(private readonly setting: RunsSetting) {
    this.#program = compile(setting.file, factsOf(setting.rig));
  }

  /**
   * The nth session, from 0: its own animal and draws, whoever runs it and after what.
   * @param progress called about every virtual minute; true gives the session up
   */
  run(n: number, progress: () => boolean = () => false): RunResult {
    const { rig, file, trained, animal, minutes, everyFrame, latency } = this.setting;
    const seed = `${this.setting.seed} run ${n + 1}`;
    const collector = new RunCollector(file, rig, n, seed, latency);
    const animalSeed = murmur3(seed, 0x616e) >>> 1;
    const parameters = individual(animal, animalSeed);
    const { inquest: inquiry } = collector;
    const setup = {
      rig,
      program: this.#program,
      title: file.title,
      seed,
      waterTodayNl: 0,
      inquiry,
    };
    const simulated = simulatedRigFor(
      rig,
      { seed: animalSeed, trained, animal: parameters },
      !everyFrame,
    );
    const { belt } = simulated.simulated;
    const offsetCm = rig.belt.seam?.offsetCm ?? 0;
    simulated.simulated.board.probe((_, on, us) => {
      if (on) collector.rose(us, belt.positionCm + offsetCm);
    });
    rehearse(setup, simulated, {
      mostUs: minutes * 60_000_000,
      onDecision: collector.take,
      progress,
    });
    return collector.result;
  }
}
