/** A change of the lick sensor, in board time. */
export interface LickEdge {
  readonly atUs: number;
  readonly level: 0 | 1;
}

/** Something touched the sensor. */
export interface Contact {
  readonly fromUs: number;
  readonly lastsUs: number;
}

/** From each rise to the fall that follows it. */
export function contactsOf(edges: readonly LickEdge[]): Contact[] {
  const contacts: Contact[] = [];
  let fromUs: number | undefined;
  for (const { atUs, level } of edges) {
    if (level === 1) {
      fromUs ??= atUs;
    } else if (fromUs !== undefined) {
      contacts.push({ fromUs, lastsUs: atUs - fromUs });
      fromUs = undefined;
    }
  }
  return contacts;
}

/** From each onset to the next, microseconds. */
export function intervalsOf(contacts: readonly Contact[]): number[] {
  return contacts.slice(1).map((contact, i) => contact.fromUs - contacts[i]!.fromUs);
}
