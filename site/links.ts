/**
 * Every link of the site is relative and names its file, so that pages open from a folder, from a server and under
 * any path. Targets are written from the site's root: 'cells/index.html?standing=sound#table'.
 */

/**
 * The link from one page to a file of the site.
 *
 * @param from the page that holds the link, from the site's root, e.g. 'notes/a/index.html'
 * @param to the target from the site's root, with query and fragment where there are any
 * @throws RangeError for a target that is absolute or names no file
 */
export function relativeLink(from: string, to: string): string {
  const [, path = '', tail = ''] = /^([^?#]*)(.*)$/s.exec(to) ?? [];
  if (path === '' || path.startsWith('/') || path.endsWith('/') || /^[a-z][a-z+.-]*:/i.test(path))
    throw new RangeError(`a link's target must name a file from the site's root, got "${to}"`);
  const here = from.split('/').slice(0, -1);
  const there = path.split('/');
  let shared = 0;
  while (shared < here.length && shared < there.length - 1 && here[shared] === there[shared]) shared++;
  const steps = [...here.slice(shared).map(() => '..'), ...there.slice(shared)];
  return steps.join('/') + tail;
}

export type Link = (to: string) => string;

/** The link function of one page. */
export const linksFrom =
  (page: string): Link =>
  (to) =>
    relativeLink(page, to);
