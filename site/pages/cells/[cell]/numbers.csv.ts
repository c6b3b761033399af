import { almanac } from '../../../almanac.ts';
import { numbersCsv } from '../../../cell/downloads.ts';

export function getStaticPaths() {
  return [...almanac().cellNames].map(([id, name]) => ({ params: { cell: name }, props: { id } }));
}

export const GET = ({ props }: { props: { id: string } }): Response =>
  new Response(numbersCsv(almanac().cell(props.id)));
