/** Writes recipes/recipe.schema.json anew: `npm run schema`. */

import { writeFileSync } from 'node:fs';
import { stageKinds } from '../../stages/kinds.ts';
import { formatRecipeSchema } from './schema.ts';

writeFileSync(new URL('../../recipes/recipe.schema.json', import.meta.url), formatRecipeSchema(stageKinds));
