/** `npm run pages`: writes the pages that are made from tables in the code. */
import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { errorsPage } from '../../server/errors/errorsPage.js';
import { packageRoot } from '../../server/packageRoot.js';

writeFileSync(join(packageRoot, 'server/errors/ERRORS.md'), errorsPage());
