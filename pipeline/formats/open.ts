import { openNwb } from './nwb-open.ts';
import { openText } from './text-open.ts';
import type { FormatId, OpenRecording, ReadingHints } from './types.ts';

export { claimFormat } from './claims.ts';
export { FormatError } from './problems.ts';

/**
 * Opens one recording for description and reading. Meant for a worker thread with a time limit: it may block, and a
 * damaged file may make the library underneath loop; after any error the worker is best replaced.
 *
 * @param absolutePath the file
 * @param format the reader that claims it, see `claimFormat`
 * @param hints what the archive says about reading it
 * @throws FormatError carrying the problem where the file cannot be read at all
 */
export async function openRecording(
  absolutePath: string,
  format: FormatId,
  hints: ReadingHints,
): Promise<OpenRecording> {
  return format === 'nwb' ? openNwb(absolutePath, hints) : openText(absolutePath, hints);
}
