import type { StampedDecision } from '../session/decisions.js';

/** An event as one line for a terminal; undefined for those too frequent to print. */
export function eventLine(event: StampedDecision): string | undefined {
  const text = words(event);
  if (text === undefined) return undefined;
  const place = event.positionCm === null ? '' : ` ${event.positionCm.toFixed(1)} cm`;
  return `lap ${event.lap}${place}: ${text}`;
}

function words(event: StampedDecision): string | undefined {
  switch (event.kind) {
    case 'fired': {
      if (event.sham) return `${event.rule} as sham`;
      const error = event.errorMm === null ? '' : ` (${event.errorMm.toFixed(2)} mm off)`;
      return `${event.rule} fired ${event.output ?? ''}${error}`.trim();
    }
    case 'withheld':
    case 'missed':
    case 'refused':
    case 'uncertain':
      return `${event.rule} ${event.kind}: ${event.reason}`;
    case 'field predicted':
      return (
        `${event.rule}: predicted field ${event.widthCm.toFixed(0)} cm wide, ` +
        `peak at ${event.peakCm.toFixed(0)} cm`
      );
    case 'phase began':
      return `phase ${event.phase} (${event.reason})`;
    case 'seam':
      return event.event === 'accepted' ? undefined : `seam mark: ${event.event}`;
    case 'trust':
      return `position is ${event.trust}: ${event.reason}`;
    case 'lick sensor':
      return `lick sensor ${event.state}`;
    case 'operator':
      return `${event.who}: ${event.act.act}`;
    case 'link':
      return `board ${event.state}${event.reason ? `: ${event.reason}` : ''}`;
    case 'board fault':
      return `board fault ${event.fault} ${event.detail}`;
    case 'frames lost':
      return `${event.frames} frames lost: ${event.why}`;
    case 'session began':
      return `session began: ${event.title}, seed ${event.seed}`;
    default:
      return undefined;
  }
}
