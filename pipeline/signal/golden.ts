/** Minimum of a function that has one minimum in the bracket, to about `tolerance` of its abscissa. */
export function goldenMinimum(f: (x: number) => number, from: number, to: number, tolerance = 1e-10): number {
  const ratio = (Math.sqrt(5) - 1) / 2;
  let a = from;
  let b = to;
  let c = b - ratio * (b - a);
  let d = a + ratio * (b - a);
  let fc = f(c);
  let fd = f(d);
  for (let i = 0; i < 100 && Math.abs(b - a) > tolerance * (Math.abs(a) + Math.abs(b) + 1e-300); i++) {
    if (fc <= fd) {
      b = d;
      d = c;
      fd = fc;
      c = b - ratio * (b - a);
      fc = f(c);
    } else {
      a = c;
      c = d;
      fc = fd;
      d = a + ratio * (b - a);
      fd = f(d);
    }
  }
  return (a + b) / 2;
}
