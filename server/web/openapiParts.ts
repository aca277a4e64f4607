/** What the description of the HTTP interface is put together from. */
export const json = (schema: unknown) => ({ 'application/json': { schema } });
export const ref = (name: string) => ({ $ref: `#/components/schemas/${name}` });

/** Every other answer. */
export const problems = {
  description: 'Problem details (RFC 9457), with a stable `code` and a `remedy`.',
  content: { 'application/problem+json': { schema: ref('Problem') } },
};
export const done = { description: 'The loop did it.', content: json(ref('Done')) };

/** A request that changes something, with a body of this schema. */
export function asks(summary: string, body: string) {
  return {
    post: {
      summary,
      requestBody: { required: true, content: json(ref(body)) },
      responses: { '200': done, default: problems },
    },
  };
}

/** A request that only reads. */
export function shows(summary: string, schema: unknown) {
  return {
    get: {
      summary,
      responses: {
        '200': { description: 'As it is now.', content: json(schema) },
        default: problems,
      },
    },
  };
}
