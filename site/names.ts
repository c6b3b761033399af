import { createHash } from 'node:crypto';

/** Names that a Windows share refuses as a folder. */
const refused = /^(con|prn|aux|nul|com\d|lpt\d|index)(\.|$)/i;
const longest = 64;

/**
 * Folder names for pages, one for each id: the id itself where every file system and address takes it as it is, else
 * a readable form of it with a part of its digest. Ids that differ only in case get different names even where the
 * file system would take them for one.
 *
 * @param ids all ids of one kind, each once
 */
export function pageNames(ids: readonly string[]): Map<string, string> {
  const met = new Map<string, number>();
  for (const id of ids) met.set(id.toLowerCase(), (met.get(id.toLowerCase()) ?? 0) + 1);
  return new Map(
    ids.map((id) => {
      const plain = plainName(id);
      const asItIs = plain === id && id.length <= longest && !refused.test(id) && met.get(id.toLowerCase()) === 1;
      return [id, asItIs ? id : `${plain.slice(0, longest - 9)}-${digest(id)}`];
    }),
  );
}

function plainName(id: string): string {
  const plain = id
    .normalize('NFKD')
    .replace(/\p{Mark}/gu, '')
    .replace(/[^A-Za-z0-9._~-]+/g, '-')
    .replace(/^[.-]+|[.-]+$/g, '');
  return plain === '' ? 'unnamed' : plain;
}

const digest = (id: string): string => createHash('sha256').update(id).digest('hex').slice(0, 8);
