import type { LearningDay } from '../../analysis/learning.js';
import type { LearningTold } from './recordsMessages.js';

/** Days as they were before JSON, which has no NaN, made null of what could not be had. */
export function learningDays({ days }: LearningTold): LearningDay[] {
  return days.map((day) => withNaN(day) as LearningDay);
}

function withNaN(value: unknown): unknown {
  if (value === null) return Number.NaN;
  if (typeof value !== 'object') return value;
  return Object.fromEntries(Object.entries(value).map(([key, one]) => [key, withNaN(one)]));
}
