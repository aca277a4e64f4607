interface Counted {
  readonly name: string;
  readonly fired: number;
  readonly shams: number;
  readonly not: readonly { readonly why: string; readonly times: number }[];
}

/** The first cells of a rule's row: its name with why it did not fire; fired, sham, not. */
export function RuleCounts({ rule }: { rule: Counted }) {
  const not = rule.not.reduce((sum, { times }) => sum + times, 0);
  return (
    <>
      <th scope="row">
        {rule.name}
        {rule.not.map(({ why, times }) => (
          <span key={why} class="why">
            {times} times {why}
          </span>
        ))}
      </th>
      <td>{rule.fired}</td>
      <td>{rule.shams}</td>
      <td class={not > 0 ? 'some' : ''}>{not}</td>
    </>
  );
}
