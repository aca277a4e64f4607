import fs from 'node:fs';
import path from 'node:path';
import type { File } from 'h5wasm/node';
import { parse } from 'yaml';
import { packageRoot } from '../../packageRoot.js';
import type { NwbBuilder } from './hdf5.js';

/** The standard's own schema files, with their licence beside them. */
const FOLDER = path.join(packageRoot, 'server', 'export', 'nwb', 'schema');
const NAMESPACES = ['hdmf-common/namespace.yaml', 'core/nwb.namespace.yaml'];

interface Namespace {
  readonly name: string;
  readonly version: string | number;
  readonly schema: readonly { readonly source?: string }[];
}

/**
 * Keeps the standard's schema in the file, as NWB's storage rules have it ("Caching format
 * specifications"): `/specifications/NAMESPACE/VERSION/SOURCE`, each a JSON text, and a reference to
 * them at the root. A reader that knows another version of the standard then still understands it.
 */
export function putSpecifications(nb: NwbBuilder, nwb: File): void {
  const specifications = nb.group(nwb, 'specifications');
  const reference = (
    specifications as unknown as { create_reference(): unknown }
  ).create_reference();
  nwb.create_attribute('.specloc', reference as never);
  for (const file of NAMESPACES) {
    const folder = path.join(FOLDER, path.dirname(file));
    const { namespaces } = yaml(path.join(FOLDER, file)) as { namespaces: Namespace[] };
    for (const namespace of namespaces) {
      const version = String(namespace.version);
      const group = nb.group(nb.group(specifications, namespace.name), version);
      const schema = namespace.schema.map((part) => {
        if (part.source === undefined) return part;
        const source = part.source.replace(/\.yaml$/, '');
        nb.text(group, source, JSON.stringify(yaml(path.join(folder, part.source))));
        return { ...part, source };
      });
      nb.text(
        group,
        'namespace',
        JSON.stringify({ namespaces: [{ ...namespace, version, schema }] }),
      );
    }
  }
}

function yaml(file: string): unknown {
  return parse(fs.readFileSync(file, 'utf8'));
}
