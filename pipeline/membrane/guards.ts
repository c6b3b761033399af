import { zeroCelsiusK } from './constants.ts';

/** Guards at the public door of this folder: each returns its argument or throws a RangeError that names it. */

export function requireConcentration(name: string, millimolar: number): number {
  if (!(Number.isFinite(millimolar) && millimolar > 0))
    throw new RangeError(`${name} must be a finite concentration above 0 mmol/L, got ${millimolar}`);
  return millimolar;
}

export function requireAmount(name: string, millimolar: number): number {
  if (!(Number.isFinite(millimolar) && millimolar >= 0))
    throw new RangeError(`${name} must be a finite concentration of 0 mmol/L or more, got ${millimolar}`);
  return millimolar;
}

export function requireCelsius(name: string, celsius: number): number {
  if (!(Number.isFinite(celsius) && celsius > -zeroCelsiusK))
    throw new RangeError(`${name} must be a finite temperature above -273.15 °C, got ${celsius}`);
  return celsius;
}

export function requireValence(name: string, valence: number): number {
  if (!Number.isInteger(valence) || valence === 0)
    throw new RangeError(`${name} must be a whole signed charge number other than 0, got ${valence}`);
  return valence;
}

export function requireNonNegative(name: string, value: number, unit: string): number {
  if (!(Number.isFinite(value) && value >= 0))
    throw new RangeError(`${name} must be a finite number of 0${unit} or more, got ${value}`);
  return value;
}

export function requirePositive(name: string, value: number, unit: string): number {
  if (!(Number.isFinite(value) && value > 0))
    throw new RangeError(`${name} must be a finite number above 0${unit}, got ${value}`);
  return value;
}
