import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import type { NoteRow } from '../../pipeline/ledger/types.ts';
import { parseNote } from '../../pipeline/notes/parse.ts';

const cellIds = new Set(['2026-03-12-s2c1', '2026-03-12-s2c1~2', 'old 07', 'c1']);
const noteIds = new Set(['2026/week-11', '2026/week-12', 'bench/pump', 'undated thoughts']);
const files = new Set([
  'notes/2026/rig.png',
  'notes/pictures/two spikes.jpg',
  'recordings/a.csv',
  'notes/2026/drawing.svg',
]);

const note = (text: string, path = 'notes/2026/week-11.md'): NoteRow =>
  parseNote({ path, text, cellIds, noteIds, fileExists: (one) => files.has(one) });
const lines = (text: string): string => text.replace(/^\n/, '');
const said = (row: NoteRow): string =>
  row.problems.map((one) => `${one.line}: ${one.message} ${one.remedy}`).join('\n');

describe('the edges', () => {
  it('an empty note is a note with its file name for a title', () =>
    expect(note('')).toEqual({
      id: '2026/week-11',
      path: 'notes/2026/week-11.md',
      title: 'week-11',
      date: null,
      author: null,
      html: '',
      text: '',
      cells: [],
      links: [],
      figures: [],
      images: [],
      problems: [],
    }));
  it('front matter alone', () =>
    expect(note('---\ntitle: Only this\n---\n')).toMatchObject({ title: 'Only this', html: '' }));
  it('an empty front matter', () =>
    expect(note('---\n---\nWords.')).toMatchObject({ html: '<p>Words.</p>', problems: [] }));
  it('a byte order mark and line ends of Windows', () => {
    const row = note('\uFEFF---\r\ntitle: From Windows\r\ndate: 2026-03-13\r\n---\r\nOne.\r\n\r\nTwo.\r\n');
    expect(row).toMatchObject({ title: 'From Windows', date: '2026-03-13', text: 'One.\nTwo.', problems: [] });
  });
  it('a note outside notes/ keeps its path for an id', () => expect(note('x', 'minutes/a.MD').id).toBe('minutes/a'));
  it('nesting beyond reason costs this note only, and keeps its words', () => {
    const row = note(`${'> '.repeat(2_000)}deep`);
    expect(row.text).toContain('deep');
    if (row.html === '') expect(said(row)).toMatch(/could not be read: .* Simplify its nesting/);
  });
});

describe('front matter', () => {
  it('gives title, date, author, cells and tags', () => {
    const row = note(
      '---\ntitle: "Rig B: drift"\ndate: 2026-03-12\nauthor: k\ncells: [c1, old 07]\ntags: [drift, pump]\n---\nSee below.',
    );
    expect(row).toMatchObject({
      title: 'Rig B: drift',
      date: '2026-03-12',
      author: 'k',
      cells: ['c1', 'old 07'],
      tags: ['drift', 'pump'],
      problems: [],
      html: '<p>See below.</p>',
      text: 'See below.',
    });
  });
  it('takes single names and comma lists too', () =>
    expect(note('---\ncells: c1, old 07\ntags: drift\n---\n')).toMatchObject({
      cells: ['c1', 'old 07'],
      tags: ['drift'],
    }));
  it('takes the date out of a date with a time', () =>
    expect(note('---\ndate: 2026-03-12T14:05\n---\n').date).toBe('2026-03-12'));
  it('or of the file name, where it states none', () => {
    expect(note('x', 'notes/2026-03-12 meeting.md')).toMatchObject({ date: '2026-03-12', title: '2026-03-12 meeting' });
    expect(note('x', 'notes/2026-02-30.md').date).toBeNull();
  });
  test.each([
    ['---\ntitle: x\nauthr: k\n---\n', /^3: .*"authr" is not known\. The nearest is "author"\. Known keys are/],
    ['---\ntitle: a: b\n---\n', /^2: The front matter is not valid YAML/],
    ['---\n- a\n- b\n---\n', /^2: The front matter is no list of keys and values/],
    ['---\ndate: 12.3.2026\n---\n', /^2: The date "12\.3\.2026" is no date .* 2026-03-12/],
    ['---\ndate: 2026-02-30\n---\n', /^2: The date "2026-02-30"/],
    ['---\ntitle: [a]\n---\n', /^2: .*"title" is no text/],
    ['---\ncells: {a: b}\n---\n', /^2: .*"cells" is no list of names/],
    [
      '---\ntitle: x\ncells: [c1, c2]\n---\n',
      /^3: "c2" under "cells" is no cell of this archive\. The nearest is "c1"/,
    ],
    ['---\ntitle: x\n\nNo end.\n', /^1: The front matter that begins here does not end\. Close it/],
  ])('%j is said with its line and what to do', (text, message) => {
    const row = note(text);
    expect(row.problems).toHaveLength(1);
    expect(said(row)).toMatch(message);
  });
  it('that is broken does not cost the text', () =>
    expect(note('---\ntitle: "x\n---\n\nStill here.')).toMatchObject({ html: '<p>Still here.</p>', title: 'week-11' }));
  it('cannot blow up through references', () => {
    const row = note(
      `---\ntitle: &a [x,x,x,x,x,x,x,x,x]\nb: &b [*a,*a,*a,*a,*a,*a,*a,*a,*a]\nc: &c [*b,*b,*b,*b,*b,*b,*b,*b,*b]\ntags: [*c,*c,*c,*c,*c,*c,*c,*c,*c]\n---\nText`,
    );
    expect(row.html).toBe('<p>Text</p>');
    expect(row.problems.length).toBeGreaterThan(0);
  });
});

describe('title and headings', () => {
  it('the first heading is the title where none is stated, and leaves the text', () =>
    expect(note('# The pump\n\nWords.\n\n## More')).toMatchObject({
      title: 'The pump',
      html: '<p>Words.</p>\n<h2>More</h2>',
    }));
  it('a heading that repeats the title leaves the text', () =>
    expect(note('---\ntitle: The pump\n---\n# The pump\n\nWords.').html).toBe('<p>Words.</p>'));
  it('first-level headings that stay move down below the page’s own', () =>
    expect(note('---\ntitle: Week\n---\n# One\n\n## Two').html).toBe('<h2>One</h2>\n<h3>Two</h3>'));
});

describe('links', () => {
  it('to cells and notes keep their scheme, encoded, and are listed once', () => {
    const row = note(
      'See [the cell](cell:2026-03-12-s2c1), [again](cell:2026-03-12-s2c1 "title"), [copy](cell:2026-03-12-s2c1~2), [old](<cell:old 07>) and [the pump](note:bench/pump).',
    );
    expect(row.problems).toEqual([]);
    expect(row.cells).toEqual(['2026-03-12-s2c1', '2026-03-12-s2c1~2', 'old 07']);
    expect(row.links).toEqual(['bench/pump']);
    expect(row.html).toContain('<a href="cell:2026-03-12-s2c1">the cell</a>');
    expect(row.html).toContain('<a href="cell:old%2007">old</a>');
    expect(row.html).toContain('<a href="note:bench%2Fpump">the pump</a>');
  });
  it('between angle brackets show the id alone', () =>
    expect(note('Look at <cell:c1>.').html).toBe('<p>Look at <a href="cell:c1">c1</a>.</p>'));
  it('by reference', () => expect(note('[x][1]\n\n[1]: cell:c1')).toMatchObject({ cells: ['c1'], problems: [] }));
  it('to another note’s file become note links', () => {
    expect(note('[next](week-12.md#later)')).toMatchObject({ links: ['2026/week-12'], problems: [] });
    expect(note('[pump](../bench/pump.md)')).toMatchObject({ links: ['bench/pump'], problems: [] });
    expect(note('[u](/notes/undated%20thoughts.md)')).toMatchObject({ links: ['undated thoughts'], problems: [] });
  });
  it('to a picture are listed with the pictures', () =>
    expect(note('[photo](rig.png)')).toMatchObject({ images: ['notes/2026/rig.png'], problems: [] }));
  it('to the web and to mail stay', () => {
    const row = note('<https://example.org/a?b=1&c=2>, www.example.org and [mail](mailto:k@example.org)');
    expect(row.problems).toEqual([]);
    expect(row.html).toContain('href="https://example.org/a?b=1&#x26;c=2"');
    expect(row.html).toContain('href="mailto:k@example.org"');
  });
  it('to a quantity', () => {
    expect(note('[rest](quantity:resting_potential_mv)')).toMatchObject({ problems: [] });
    expect(said(note('[rest](quantity:resting_potental_mv)'))).toMatch(/nearest is "resting_potential_mv"/);
  });
  test.each([
    ['[a](cell:c2)', /"cell:c2" leads to no cell of this archive\. The nearest is "c1"\. Correct the id/],
    ['[a](cell:)', /"cell:" leads to no cell/],
    ['[a](note:bench/pmp)', /"note:bench\/pmp" leads to no note .* nearest is "bench\/pump"/],
    ['[a](week-99.md)', /"week-99\.md" leads to no note or picture/],
    ['[a](../../recordings/a.csv)', /leads to a file that the site does not carry/],
    ['[a](../../../../etc/passwd)', /leads to no note or picture/],
    ['[a](file:///etc/passwd)', /is not followed here/],
    ['[a](//example.org/x)', /is not followed here/],
    ['[a](ftp://example.org)', /is not followed here/],
  ])('%s keeps its words and says what is wrong', (text, message) => {
    const row = note(`First.\n\n${text}`);
    expect(row.html).toBe('<p>First.</p>\n<p>a</p>');
    expect(row.problems[0]!.line).toBe(3);
    expect(said(row)).toMatch(message);
    expect([...row.cells, ...row.links, ...row.images]).toEqual([]);
  });
});

describe('pictures', () => {
  it('are turned to their path in the archive', () => {
    const row = note('![The rig](rig.png)\n\n![Two](../pictures/two%20spikes.jpg "t")\n\n![D](<./drawing.svg>)');
    expect(row.problems).toEqual([]);
    expect(row.images).toEqual(['notes/2026/rig.png', 'notes/pictures/two spikes.jpg', 'notes/2026/drawing.svg']);
    expect(row.html).toContain('<img src="file:notes/2026/rig.png" alt="The rig">');
    expect(row.html).toContain('src="file:notes/pictures/two%20spikes.jpg"');
  });
  test.each([
    ['![alt](lost.png)', /"notes\/2026\/lost\.png" is not in the archive/],
    ['![alt](../../../x.png)', /lies outside the archive/],
    ['![alt](../../recordings/a.csv)', /is no picture/],
    ['![alt](https://example.org/x.png)', /is not a file of the archive and is left out\. Save it beside the note/],
    ['![alt](//example.org/x.png)', /is not a file of the archive/],
    ['![alt](file:///etc/x.png)', /is not a file of the archive/],
    ['![alt](data:image/png;base64,AAAA)', /is not a file of the archive/],
    ['![alt](javascript:alert(1))', /is not a file of the archive/],
  ])('%s leaves its description and says why', (text, message) => {
    const row = note(text);
    expect(row.html).toBe('<p>[alt]</p>');
    expect(row.images).toEqual([]);
    expect(said(row)).toMatch(message);
  });
  it('without a description are shown and said', () => {
    const row = note('![](rig.png)');
    expect(row.images).toEqual(['notes/2026/rig.png']);
    expect(said(row)).toMatch(/has no description/);
  });
});

describe('sweep blocks', () => {
  it('become a placeholder and a figure', () => {
    const row = note(
      lines(`
Before.

\`\`\`sweep
cell: 2026-03-12-s2c1
sweep: 3
from_s: 0.15
to_s: 0.8
caption: The rest creeps up.
\`\`\`

After.

\`\`\`sweep
cell: c1
\`\`\`
`),
    );
    expect(row.problems).toEqual([]);
    expect(row.html).toBe(
      '<p>Before.</p>\n<figure data-figure="0"></figure>\n<p>After.</p>\n<figure data-figure="1"></figure>',
    );
    expect(row.figures).toEqual([
      { cell: '2026-03-12-s2c1', sweep: 3, from_s: 0.15, to_s: 0.8, caption: 'The rest creeps up.' },
      { cell: 'c1', sweep: null, from_s: null, to_s: null, caption: '' },
    ]);
    expect(row.cells).toEqual(['2026-03-12-s2c1', 'c1']);
    expect(row.text).toBe('Before.\nThe rest creeps up.\nAfter.');
  });
  test.each([
    ['cell: c2\ncaption: Lost', /^3: .*"c2" is no cell of this archive\. The nearest is "c1"/, 0],
    ['sweep: 3', /^3: The sweep block names no cell/, 0],
    ['', /^3: The sweep block holds no keys/, 0],
    ['just words', /^3: The sweep block holds no keys/, 0],
    ['cell: [', /not valid YAML/, 0],
    ['cell: c1\nsweep: -1', /^4: .*"sweep" must be a whole number of 0 or more/, 1],
    ['cell: c1\nsweep: 1.5', /^4: .*"sweep" must be a whole number/, 1],
    ['cell: c1\nfrom_s: soon', /^4: .*"from_s" must be a number/, 1],
    ['cell: c1\nfrom_s: 2\nto_s: 1', /^5: .*to_s \(1\) is not after from_s \(2\)/, 1],
    ['cell: c1\ncaptoin: x', /^4: .*"captoin" is not known\. The nearest is "caption"/, 1],
  ])('%j is said with its line', (body, message, figures) => {
    const row = note(`x\n\`\`\`sweep\n${body}\n\`\`\``);
    expect(said(row)).toMatch(message);
    expect(row.figures).toHaveLength(figures);
    expect(row.html.match(/<figure/g) ?? []).toHaveLength(figures);
    if (figures === 0) expect(row.html).toContain('Figure left out.');
  });
  it('other fenced blocks stay code', () =>
    expect(note('```yaml\ncell: c1\n```').html).toBe('<pre><code class="language-yaml">cell: c1\n</code></pre>'));
});

describe('tables, task lists, footnotes', () => {
  it('pass', () => {
    const row = note('| rig | drift |\n|---|--:|\n| a | 0.1 |\n\n- [x] done\n- [ ] open\n\n~~no~~');
    expect(row.html).toContain('<td align="right">0.1</td>');
    expect(row.html).toContain('<input type="checkbox" checked disabled>');
    expect(row.html).toContain('<del>no</del>');
  });
  it('footnotes link there and back, under ids of the note’s own', () => {
    const row = note('One.[^1] Two.[^long]\n\n[^1]: First.\n[^long]: Second, see [c](cell:c1).');
    expect(row.problems).toEqual([]);
    const ids = [...row.html.matchAll(/ id="([^"]+)"/g)].map((match) => match[1]!);
    const targets = [...row.html.matchAll(/ href="#([^"]+)"/g)].map((match) => match[1]!);
    expect(targets).toHaveLength(4);
    for (const target of targets) expect(ids).toContain(target);
    expect(new Set(ids).size).toBe(ids.length);
    expect(ids.filter((one) => one.startsWith('2026-week-11-')).length).toBe(4);
    expect(row.cells).toEqual(['c1']);
  });
});

/** Everything by which HTML could run something, load something or leave the note's own box. */
function dangers(html: string): string[] {
  const found: string[] = [];
  for (const [tag, name, attributes] of html.matchAll(/<\/?([a-zA-Z][^\s/>]*)([^>]*)>/g)) {
    if (
      !/^(?:a|blockquote|br|code|del|em|figure|h[1-6]|hr|img|input|li|ol|p|pre|section|strong|sup|table|tbody|td|th|thead|tr|ul)$/.test(
        name!,
      )
    )
      found.push(tag);
    for (const [, attribute, value] of attributes!.matchAll(/([^\s=]+)(?:="([^"]*)")?/g)) {
      if (/^on/i.test(attribute!) || attribute === 'style' || attribute === 'srcdoc') found.push(tag);
      if (attribute === 'href' && !/^(?:#|https?:|mailto:|cell:|note:|quantity:|file:)/.test(value ?? ''))
        found.push(tag);
      if (attribute === 'src' && !/^file:/.test(value ?? '')) found.push(tag);
    }
  }
  return found;
}

describe('hostile notes', () => {
  it('the check itself sees what it should', () => {
    for (const html of [
      '<script>x</script>',
      '<a href="javascript:x">x</a>',
      '<img src="https://x">',
      '<p onclick="x">',
      '<p style="x">',
      '<iframe>',
    ])
      expect(dangers(html)).not.toEqual([]);
  });
  test.each([
    '<script>alert(1)</script>',
    '<SCRIPT SRC=https://example.org/x.js></SCRIPT>',
    '<img src=x onerror=alert(1)>',
    '<svg/onload=alert(1)>',
    '<iframe src="javascript:alert(1)"></iframe>',
    '<figure data-figure="7"></figure>',
    '<style>*{display:none}</style>',
    '<a href="javascript:alert(1)">x</a>',
    'text <b onmouseover=alert(1)>bold</b> text',
    '<div\nonclick="alert(1)">x</div>',
    '<!-- <script>alert(1)</script> -->',
    '<![CDATA[<script>alert(1)</script>]]>',
    '<?php echo 1 ?>',
    '[x](javascript:alert(1))',
    '[x](JaVaScRiPt:alert(1))',
    '[x](<java\tscript:alert(1)>)',
    '[x](&#106;avascript:alert(1))',
    '[x](javascript&colon;alert(1))',
    '[x](\\javascript:alert(1))',
    '[x](<\u0001javascript:alert(1)>)',
    '[x](vbscript:x)',
    '[x](data:text/html;base64,PHNjcmlwdD4=)',
    '<javascript:alert(1)>',
    '[x][1]\n\n[1]: javascript:alert(1)',
    '![x](x"onerror="alert(1).png)',
    '![x" onerror="alert(1)](rig.png)',
    '![<script>alert(1)</script>](rig.png)',
    '[![x](javascript:alert(1))](javascript:alert(2))',
    '[a [b](javascript:1) c](javascript:2)',
    '[x](cell:c1"onclick="alert(1))',
    '[x](<cell:c1#"onclick="alert(1)>)',
    '[x](cell:c1 "t\\" onclick=\\"alert(1)")',
    '[x](https://example.org "><script>alert(1)</script>")',
    '```"><script>alert(1)</script>\ncode\n```',
    '```sweep\ncell: c1\ncaption: <script>alert(1)</script>\n```',
    '```sweep\ncell: "<script>alert(1)</script>"\n```',
    '[^"><script>]\n\n[^"><script>]: x',
    '| <script>alert(1)</script> |\n|---|\n| <img src=x onerror=alert(1)> |',
    '> - <script>alert(1)</script>\n>   1. [x](javascript:1)',
    '---\ntitle: <script>alert(1)</script>\n---\n',
    '# <img src=x onerror=alert(1)>',
    '\u0000<script>alert(1)</script>',
    '<a href="',
    '<img src="x" alt="`"><script>alert(1)</script>`">',
  ])('%j runs nothing', (text) => {
    const { html } = note(text);
    expect(dangers(html)).toEqual([]);
    expect(html).not.toMatch(/<script/i);
    expect(html).not.toMatch(/data-figure="7"/);
  });
  it('raw HTML is said to be left out, comments are not', () => {
    expect(said(note('A\n\n<div>b</div>'))).toMatch(/^3: Raw HTML is left out: "<div>b<\/div>"\. Write it in Markdown/);
    expect(note('<!-- to do -->').problems).toEqual([]);
    expect(note('a <b>c</b>').problems).toHaveLength(1);
  });
  it('raw HTML between backticks is shown as text', () =>
    expect(note('`<script>`').html).toBe('<p><code>&#x3C;script></code></p>'));
  it('any mixture runs nothing, throws nothing and is the same twice', () => {
    const piece = fc.constantFrom(
      ...[
        '<script>',
        '</script>',
        '<img src=x onerror=y>',
        '[x](javascript:y)',
        '![x](data:y)',
        '`',
        '```',
        '\n',
        '\n\n',
        '> ',
      ],
      ...[
        '- ',
        '[',
        ']',
        '(',
        ')',
        '"',
        "'",
        '<',
        '>',
        '&#106;',
        'javascript:',
        'cell:c1',
        '[^1]',
        '[^1]: ',
        '|',
        '|---|',
      ],
      ...[
        '---\n',
        'title: x\n',
        '# ',
        '*',
        '_',
        '\\',
        '\t',
        'onerror=',
        '```sweep\ncell: c1\n```\n',
        '<figure data-figure="7">',
      ],
    );
    fc.assert(
      fc.property(fc.array(fc.oneof(piece, fc.string({ maxLength: 5 })), { maxLength: 30 }), (pieces) => {
        const text = pieces.join('');
        const row = note(text);
        expect(dangers(row.html)).toEqual([]);
        expect(row.html).not.toMatch(/data-figure="7"/);
        expect((row.html.match(/<figure/g) ?? []).length).toBe(row.figures.length);
        expect(note(text)).toEqual(row);
        for (const problem of row.problems) expect(problem.message && problem.remedy).toBeTruthy();
      }),
      { seed: 41, numRuns: 200 },
    );
  });
});
