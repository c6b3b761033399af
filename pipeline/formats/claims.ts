import type { FormatId } from './types.ts';

const endings: Record<string, FormatId> = {
  nwb: 'nwb',
  csv: 'text',
  tsv: 'text',
  tab: 'text',
  txt: 'text',
  dat: 'text',
  asc: 'text',
};

/**
 * Which reader takes a file, by the ending of its name alone (upper or lower case).
 *
 * @returns null where no reader takes it
 */
export function claimFormat(path: string): FormatId | null {
  const ending = /\.([^./\\]+)$/.exec(path)?.[1]?.toLowerCase();
  return ending !== undefined && Object.hasOwn(endings, ending) ? endings[ending]! : null;
}
