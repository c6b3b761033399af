/** A note's HTML with its links led to the pages of this site, its pictures to the resized ones. */
import type { Almanac } from './almanac.ts';
import type { Link } from './links.ts';
import type { PreparedImage } from './prepared.ts';

export type Images = Record<string, PreparedImage | { failure: string }>;

const unescaped = (text: string): string =>
  text
    .replace(/&#x([0-9a-f]+);/gi, (_, code: string) => String.fromCodePoint(Number.parseInt(code, 16)))
    .replace(/&#(\d+);/g, (_, code: string) => String.fromCodePoint(Number(code)))
    .replaceAll('&quot;', '"')
    .replaceAll('&lt;', '<')
    .replaceAll('&gt;', '>')
    .replaceAll('&amp;', '&');

export const escaped = (text: string): string =>
  text.replaceAll('&', '&amp;').replaceAll('<', '&lt;').replaceAll('>', '&gt;').replaceAll('"', '&quot;');

function decoded(text: string): string {
  try {
    return decodeURIComponent(text);
  } catch {
    return text; // a lone percent sign: the id as it stands
  }
}

/** Where a link of a note leads: a page of the site, an address elsewhere, or nowhere (null). */
function targetOf(address: string, almanac: Almanac, link: Link): string | null {
  const [, scheme, rest = ''] = /^([a-z]+):(.*)$/s.exec(address) ?? [];
  const [id = '', fragment] = rest.split('#');
  const tail = fragment === undefined ? '' : `#${fragment}`;
  const name = decoded(id);
  switch (scheme) {
    case 'cell': {
      const cell = almanac.cellById.get(name);
      return cell ? link(cell.page + tail) : null;
    }
    case 'note': {
      const note = almanac.noteById.get(name);
      return note ? link(note.page + tail) : null;
    }
    case 'quantity':
      return link(`methods/index.html#quantity-${name}`);
    case 'check':
      return link(`methods/index.html#check-${name}`);
    case 'http':
    case 'https':
    case 'mailto':
      return address;
    default:
      return address.startsWith('#') ? address : null;
  }
}

/**
 * @param html sanitised HTML of a ledger's note: attributes in double quotes, no script
 * @returns the same with links and pictures resolved; a link that leads nowhere becomes plain text with a remark
 */
export function resolvedHtml(html: string, almanac: Almanac, images: Images, link: Link): string {
  return html
    .replace(
      /<a\b([^>]*?)\shref="([^"]*)"([^>]*)>(.*?)<\/a>/gs,
      (_, before: string, href: string, after: string, inside: string) => {
        const target = targetOf(unescaped(href), almanac, link);
        return target === null
          ? `<span class="lost" title="leads nowhere: ${href}">${inside}</span>`
          : `<a${before} href="${escaped(target)}"${after}>${inside}</a>`;
      },
    )
    .replace(/<img\b([^>]*?)\ssrc="file:([^"]*)"([^>]*?)\/?>/g, (_, before: string, source: string, after: string) => {
      const path = decoded(unescaped(source));
      const image = images[path];
      if (image === undefined || 'failure' in image)
        return `<em class="lost">[picture ${escaped(path)} could not be shown${image ? `: ${escaped(image.failure)}` : ''}]</em>`;
      return `<img${before} src="${escaped(link(image.file))}" width="${image.width}" height="${image.height}" loading="lazy"${after}>`;
    });
}
