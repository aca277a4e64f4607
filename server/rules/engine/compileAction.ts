import type { Action, Cap } from '../ast.js';
import type { Builder } from './builder.js';
import { compileCondition } from './compileCondition.js';
import { compileSum, constant } from './compileSum.js';
import type { ActionSpec, CapSpec } from './program.js';

export function compileAction(b: Builder, action: Action): ActionSpec {
  const delayUs = action.delay ? compileSum(b, action.delay) : undefined;
  const { body } = action;
  switch (body.kind) {
    case 'give': {
      const output = body.from
        ? b.names.need(body.from.name, 'output').output
        : b.facts.outputs.find((o) => o.kind === 'valve');
      const valve = output?.valve;
      if (!output || !valve) throw new Error('not a checked rules file: no valve to give from');
      const volumeNl = compileSum(b, body.volume);
      return {
        ...ORDER,
        delayUs,
        output: output.index,
        outputKind: output.kind,
        volumeNl,
        widthUs: (s) => Math.floor(valve.deadUs + volumeNl(s) * valve.usPerNl + 0.5),
      };
    }
    case 'pulse': {
      const { output } = b.names.need(body.output.name, 'output');
      const rate = body.train ? compileSum(b, body.train.rate) : undefined;
      const until = body.train?.until;
      return {
        ...ORDER,
        delayUs,
        output: output.index,
        outputKind: output.kind,
        widthUs: compileSum(b, body.width),
        periodUs: rate ? (s) => Math.floor(1_000_000 / rate(s) + 0.5) : undefined,
        repeats: body.train?.times ? compileSum(b, body.train.times) : undefined,
        upToUs: until ? compileSum(b, until.upTo) : undefined,
        during: until?.while ? compileCondition(b, until.while) : undefined,
      };
    }
    case 'hold': {
      const { output } = b.names.need(body.output.name, 'output');
      return {
        ...ORDER,
        delayUs,
        output: output.index,
        outputKind: output.kind,
        widthUs: compileSum(b, body.until.upTo),
        during: body.until.while ? compileCondition(b, body.until.while) : undefined,
      };
    }
    case 'stop':
      return {
        kind: 'stop',
        delayUs,
        output: b.names.need(body.output.name, 'output').output.index,
      };
    case 'go to':
      if (body.phase === 'next phase') return { kind: 'next phase', delayUs };
      return { kind: 'go to', delayUs, phase: b.names.need(body.phase.name, 'phase').index };
    case 'note':
      return { kind: 'note', delayUs };
    case 'end session':
      return { kind: 'end session', delayUs };
  }
}

const ORDER = {
  kind: 'order' as const,
  volumeNl: undefined,
  widthUs: constant(0),
  periodUs: undefined,
  repeats: undefined,
  upToUs: undefined,
  during: undefined,
};

export function compileCap(b: Builder, cap: Cap): CapSpec {
  switch (cap.kind) {
    case 'apart time':
      return { kind: 'apart time', timeUs: compileSum(b, cap.time) };
    case 'apart laps':
      return { kind: 'apart laps', laps: compileSum(b, cap.laps) };
    case 'per': {
      const count = compileSum(b, cap.count);
      if (typeof cap.per === 'string') return { kind: cap.per, count };
      return { kind: 'window', count, timeUs: compileSum(b, cap.per) };
    }
  }
}
