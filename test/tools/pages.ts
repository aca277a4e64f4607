/** `npm run pages`: writes the pages that are made from tables in the code. */
import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { ANIMAL } from '../../hardware-sim/animal/parameters.js';
import { errorsPage } from '../../server/errors/errorsPage.js';
import { packageRoot } from '../../server/packageRoot.js';
import { animalSchema, animalText, USUAL_HEAD } from '../../server/rehearse/animalFile.js';

writeFileSync(join(packageRoot, 'server/errors/ERRORS.md'), errorsPage());
writeFileSync(
  join(packageRoot, 'server/rehearse/animal.schema.json'),
  `${JSON.stringify(animalSchema(), null, 2)}\n`,
);
writeFileSync(
  join(packageRoot, 'hardware-sim/demo/animal.yaml'),
  animalText({ name: 'usual', parameters: ANIMAL }, USUAL_HEAD),
);
