/**
 * The one cookie. `SameSite=Strict`: no other site's page makes a browser send it; `HttpOnly`: no
 * script reads it; over TLS also `Secure` and the `__Host-` prefix (RFC 6265bis), so that nobody on
 * the network can plant one.
 */

/** Its name holds the rig's key, since cookies do not tell the ports of one machine apart. */
export function cookieName(key: string, secure: boolean): string {
  return `${secure ? '__Host-' : ''}lapwing-${key}`;
}

export function cookieFor(name: string, value: string, maxAgeS: number, secure: boolean): string {
  const parts = [`${name}=${value}`, 'Path=/', 'HttpOnly', 'SameSite=Strict', `Max-Age=${maxAgeS}`];
  return [...parts, ...(secure ? ['Secure'] : [])].join('; ');
}

/** The value of one cookie of a `Cookie` header; undefined without it, or when it comes twice. */
export function cookieIn(header: string | undefined, name: string): string | undefined {
  const found = (header ?? '')
    .split(';')
    .map((part) => part.trim())
    .filter((part) => part.startsWith(`${name}=`));
  return found.length === 1 ? found[0]!.slice(name.length + 1) : undefined;
}
