import type { RunsReport } from '../rehearse/runsReport.js';
import type { PowerPlan } from './lickSharePlan.js';

/** The plan in words, a row for each number of laps. */
export function planLines(plan: PowerPlan, { title, seed, animal, draws }: RunsReport): string[] {
  const { design, difference, alpha, power, rows, animalsSeen, notes } = plan;
  const per = design === 'within' ? 'animals, each under both' : 'animals in each group';
  return [
    `${title}: ${animalsSeen} simulated animals, seed ${seed}, animal ${animal}`,
    `to find a difference of ${percent(difference)} in lick share, ${design} animals, with a power of ${percent(power)} (two-sided, ${percent(alpha)})`,
    '',
    [
      'laps'.padStart(6),
      'sessions'.padStart(10),
      'share'.padStart(10),
      'SD'.padStart(10),
      per.padStart(28),
    ].join(''),
    ...rows.map(({ laps, sessions, mean, sd, animals, reached }) =>
      [
        String(laps).padStart(6),
        String(sessions).padStart(10),
        percent(mean).padStart(10),
        percent(sd).padStart(10),
        (animals === null || reached === null
          ? 'more than 400'
          : `${animals} (power ${percent(reached.power)})`
        ).padStart(28),
      ].join(''),
    ),
    '',
    ...draws.flatMap(({ name, values }) =>
      values.map(
        ({ value, share, perRun }) =>
          `draw ${name}: ${value} ${percent(share)} of draws, 5-95 % of sessions ${percent(perRun.low)} to ${percent(perRun.high)}`,
      ),
    ),
    ...notes,
  ];
}

const percent = (share: number): string => `${(share * 100).toFixed(1)} %`;
