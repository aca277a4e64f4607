/** What the body of a notice may name, as `{name}`. */
export const NOTICE_NAMES = [
  'rig',
  'subject',
  'title',
  'lap',
  'phase',
  'alarm',
  'level',
  'state',
  'text',
  'remedy',
  'at',
  'count',
] as const;
export type NoticeName = (typeof NOTICE_NAMES)[number];

/** A name in a template; braces around anything else are plain text, as JSON has them. */
export const NAME_IN_BRACES = /\{([a-z]+)\}/g;

/** Names in a template that nothing stands for. */
export function unknownNames(template: string): string[] {
  const named = [...template.matchAll(NAME_IN_BRACES)].map((match) => match[1]!);
  return named.filter((name) => !(NOTICE_NAMES as readonly string[]).includes(name));
}
