/** Where the page is served unless something else is said. */
export const DEFAULT_PORT = 8711;
