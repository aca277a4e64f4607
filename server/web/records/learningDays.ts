import type { LearningDay } from '../../analysis/learning.js';
import type { DayTold, LearningTold } from './recordsMessages.js';

/** Days as they were before JSON, which has no NaN, made null of what could not be had. */
export function learningDays({ days }: LearningTold): LearningDay[] {
  return days.map(
    (day: DayTold) =>
      Object.fromEntries(
        Object.entries(day).map(([key, value]) => [key, value ?? Number.NaN]),
      ) as unknown as LearningDay,
  );
}
