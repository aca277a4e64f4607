/** The Animals page's half of the description of the HTTP interface (OpenAPI). */
import { asks, json, problems, ref, shows } from '../openapiParts.js';

export const animalsPaths = {
  '/api/animals': {
    ...shows('The animals: weight and water today, who is still due water.', ref('Animals')),
    post: {
      ...asks(
        'Write an entry down: a weight, water by hand, a change, a correction.',
        'AnimalEntry',
      ).post,
      responses: {
        '200': { description: 'It is written down.', content: json(ref('AnimalWritten')) },
        default: problems,
      },
    },
  },
  '/api/animals/{animal}': {
    get: {
      ...shows('One animal: weights, water by day, sessions, every entry.', ref('Animal')).get,
      parameters: [{ name: 'animal', in: 'path', required: true, schema: { type: 'string' } }],
    },
  },
};
