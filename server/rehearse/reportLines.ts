import type { DrawReport, Hindrance, RuleReport, RunsReport, Spread } from './runsReport.js';

const MOST_WHY = 5;

/** The report in words: a fact a line, for a terminal. */
export function reportLines(report: RunsReport): string[] {
  const { runs, seed, animal, latency } = report;
  return [
    `${report.title}: ${runs} ${runs === 1 ? 'session' : 'sessions'}, seed ${seed}, animal ${animal}`,
    '',
    row(['', '5 %', 'median', '95 %']),
    quantity('session, min', report.minutes, 1),
    quantity('laps', report.laps, 0),
    quantity('licks', report.licks, 0),
    quantity('water, uL', report.waterUl, 1),
    ...(report.lickShare === null
      ? []
      : [quantity('licks near spout, %', scaled(report.lickShare, 100), 1)]),
    '',
    ...report.rules.flatMap((rule) => ruleLines(rule, runs, report.phases.length > 0)),
    ...phaseLines(report),
    ...report.draws.flatMap(drawLines),
    ...endLines(report),
    '',
    `Latency of what the host decides: ${latency}.`,
    ...report.notes,
  ];
}

function ruleLines(rule: RuleReport, runs: number, phases: boolean): string[] {
  const { name, when, fired, shams, byPhase, runsFired, moments, why } = rule;
  const lines = [quantity(`${name} fired`, fired, 0)];
  if (shams.most > 0) lines.push(quantity('  as sham', shams, 0));
  if (phases && fired.most > 0) {
    for (const { phase, fired: inPhase } of byPhase) {
      if (inPhase.most > 0) lines.push(quantity(`  in ${phase}`, inPhase, 0));
    }
  }
  if (runsFired === 0) {
    lines.push(
      moments === 0
        ? `  never fired: its moment never came (${when})`
        : `  never fired, asked ${moments} times (${when})`,
    );
  } else if (runsFired < runs) lines.push(`  fired in ${runsFired} of ${runs} sessions`);
  for (const hindrance of why.slice(0, MOST_WHY)) lines.push(`  ${whyWords(hindrance, runs)}`);
  if (why.length > MOST_WHY) lines.push(`  and ${why.length - MOST_WHY} other reasons`);
  if (rule.boardMm) lines.push(offWords('board', rule.boardMm));
  if (rule.hostMm) lines.push(offWords('host', rule.hostMm));
  return lines;
}

/** One hindrance in words, such as `if: speed >= 8 cm/s was not so 31 times, in 12 of 500 sessions`. */
export function whyWords({ kind, words, times, unknown, runs }: Hindrance, all: number): string {
  const often = `${times} ${times === 1 ? 'time' : 'times'}, in ${runs} of ${all} sessions`;
  const notKnown = unknown > 0 ? ` (${unknown} of them not known)` : '';
  switch (kind) {
    case 'if':
      return `not so: ${words}: ${often}${notKnown}`;
    case 'chance':
      return `${words}: ${often}`;
    case 'limit':
      return `limit met: ${words}: ${often}`;
    case 'guard':
      return `${words}: ${often}`;
  }
}

function offWords(by: string, mm: Spread): string {
  const worst = Math.max(Math.abs(mm.least), Math.abs(mm.most));
  const { low, median, high } = mm;
  return `  off the place, by the ${by}: ${signed(median)} mm, 5-95 % ${signed(low)} to ${signed(high)}, most ${worst.toFixed(2)}`;
}

function phaseLines({ phases, runs }: RunsReport): string[] {
  return phases.flatMap(({ name, runsEntered, runsNotLeft, minutes }) => {
    if (minutes === null) return [`phase ${name}: never begun`];
    const ends =
      runsNotLeft === runsEntered
        ? 'never left: sessions end in it'
        : runsNotLeft > 0
          ? `not left in ${runsNotLeft}`
          : 'always left';
    return [
      quantity(`phase ${name}, min`, minutes, 1),
      `  begun in ${runsEntered} of ${runs}, ${ends}`,
    ];
  });
}

function drawLines({ name, values }: DrawReport): string[] {
  return [
    `draw ${name}:`,
    ...values.map(({ value, times, share, perRun }) =>
      [
        `  ${value}: ${times} times, ${percent(share)}`,
        `5-95 % of sessions ${percent(perRun.low)} to ${percent(perRun.high)}`,
      ].join(', '),
    ),
  ];
}

function endLines({ ends, endAlternatives, runs }: RunsReport): string[] {
  const lines = ends.map(({ reason, runs: n }) => `ended in ${n} of ${runs}: ${reason}`);
  if (endAlternatives.length < 2) return lines;
  const alternatives = endAlternatives.map(
    ({ words, runs: n }) => `  true then in ${n} of ${runs}: ${words}`,
  );
  return [...lines, ...alternatives];
}

function quantity(name: string, { low, median, high }: Spread, decimals: number): string {
  return row([name, ...[low, median, high].map((value) => value.toFixed(decimals))]);
}

function row([name, ...cells]: readonly string[]): string {
  return `${name!.padEnd(28)}${cells.map((cell) => cell.padStart(10)).join('')}`.trimEnd();
}

function scaled(spread: Spread, by: number): Spread {
  const { least, low, median, high, most, bins } = spread;
  return {
    ...{ least: least * by, low: low * by, median: median * by },
    ...{ high: high * by, most: most * by, bins },
  };
}

const signed = (mm: number): string => `${mm < 0 ? '' : '+'}${mm.toFixed(2)}`;
const percent = (share: number): string => `${(share * 100).toFixed(1)} %`;
