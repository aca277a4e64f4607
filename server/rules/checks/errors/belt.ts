import type { Check } from '../check.js';

/** The belt of the file and that of the rig. */
export const belt: Check = ({ file, rig, problems }) => {
  const { value, at, written, dimension } = file.beltLengthCm;
  if (Number.isNaN(value)) return;
  if (dimension !== 'length') {
    problems.report('unitsDiffer', at, `\`${written}\` is no length`, {
      expected: 'a length such as `180 cm`',
    });
  } else if (value <= 0) {
    problems.report('outOfRange', at, 'a belt must be longer than nothing', {
      expected: 'more than 0 cm',
    });
  } else if (rig && Math.abs(value - rig.beltLengthCm) > rig.beltToleranceCm) {
    problems.report('beltDiffers', at, `the rig's belt is ${rig.beltLengthCm} cm long`, {
      expected: `${rig.beltLengthCm} cm, or the rig file put right`,
    });
  }
};
