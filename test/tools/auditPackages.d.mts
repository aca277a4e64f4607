interface Answer {
  readonly status: number | null;
  readonly stdout: string;
}

export function auditPackages(
  root: string,
  run?: (root: string) => Answer,
): { readonly good: boolean; readonly words: string };
