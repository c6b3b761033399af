/** A note's HTML with its links led to the pages of this site, its pictures to the resized ones. */
import type { NoteFigure } from '../pipeline/ledger/types.ts';
import type { Almanac } from './almanac.ts';
import { sweepFigure } from './charts/sweep-figure.ts';
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
function targetOf(address: string, almanac: Almanac, images: Images, link: Link): string | null {
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
    case 'file': {
      const image = images[name];
      return image && 'file' in image ? link(image.file) : null;
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
        const target = targetOf(unescaped(href), almanac, images, link);
        return target === null
          ? `<span class="lost" title="leads nowhere: ${href}">${inside}</span>`
          : `<a${before} href="${escaped(target)}"${after}>${inside}</a>`;
      },
    )
    .replace(/<input\b([^>]*)>/g, (_, attributes: string) =>
      // A task of a list: a word instead of a box that cannot be used.
      /\schecked\b/.test(attributes) ? '<span class="task">done:</span>' : '<span class="task">to do:</span>',
    )
    .replace(/<img\b([^>]*?)\ssrc="file:([^"]*)"([^>]*?)\/?>/g, (_, before: string, source: string, after: string) => {
      const path = decoded(unescaped(source));
      const image = images[path];
      if (image === undefined || 'failure' in image)
        return `<em class="lost">[picture ${escaped(path)} could not be shown${image ? `: ${escaped(image.failure)}` : ''}]</em>`;
      return `<img${before} src="${escaped(link(image.file))}" width="${image.width}" height="${image.height}" loading="lazy"${after}>`;
    });
}

/**
 * Puts figures in the places that a note keeps for them.
 *
 * @param html a note's HTML with `<figure data-figure="N"></figure>` where figure N belongs
 * @param draw the inside of figure N as HTML
 */
export const withFigures = (html: string, draw: (index: number) => string): string =>
  html.replace(
    /<figure data-figure="(\d+)"><\/figure>/g,
    (_, index: string) => `<figure>${draw(Number(index))}</figure>`,
  );

/** A note's figure: the recording as drawn on its page, and beneath it what it shows and where it comes from. */
export function figureHtml(figure: NoteFigure, almanac: Almanac, link: Link): string {
  const cell = almanac.cellById.get(figure.cell);
  if (!cell)
    return `<figcaption>${escaped(figure.caption)} (${escaped(figure.cell)} is no cell of this archive)</figcaption>`;
  const { e_na_mv, e_k_mv } = almanac.cell(figure.cell);
  const chart = sweepFigure(figure, almanac.sweeps(figure.cell), { e_na_mv, e_k_mv });
  const sweep = figure.sweep === null ? 'all sweeps of its first protocol' : `sweep ${figure.sweep}`;
  const from = `<a href="${escaped(link(cell.page))}">${escaped(cell.id)}</a>, ${sweep}`;
  const words =
    figure.caption === '' ? from : `${escaped(figure.caption)}${/[.!?…]$/.test(figure.caption) ? '' : '.'} ${from}.`;
  const drawing =
    chart === null
      ? '<p class="soft">Nothing of this stretch can be drawn.</p>'
      : `<div class="chart-frame">${chart.svg}</div>`;
  return `${drawing}<figcaption>${words}</figcaption>`;
}
