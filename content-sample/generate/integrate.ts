/** Classical fourth-order Runge–Kutta steps of a model, alone or behind an electrode. */
import type { Model } from './models.ts';

/** Work space of one model; reused from step to step. */
export interface Integrator {
  state: Float64Array;
  /** One step of `dt` ms with the injected density held, see `Model.derive`. */
  step(dt_ms: number, i0: number, clamp: number, command: number): void;
}

/** @param start state to begin from; it is copied */
export function integrator(model: Model, start: Float64Array): Integrator {
  const n = start.length;
  const state = Float64Array.from(start);
  const k1 = new Float64Array(n);
  const k2 = new Float64Array(n);
  const k3 = new Float64Array(n);
  const k4 = new Float64Array(n);
  const trial = new Float64Array(n);
  // Models state their rates for C = 1 µF/cm², which all five use.
  return {
    state,
    step(dt, i0, clamp, command) {
      const half = dt / 2;
      model.derive(state, k1, i0, clamp, command);
      for (let k = 0; k < n; k++) trial[k] = state[k]! + half * k1[k]!;
      model.derive(trial, k2, i0, clamp, command);
      for (let k = 0; k < n; k++) trial[k] = state[k]! + half * k2[k]!;
      model.derive(trial, k3, i0, clamp, command);
      for (let k = 0; k < n; k++) trial[k] = state[k]! + dt * k3[k]!;
      model.derive(trial, k4, i0, clamp, command);
      const sixth = dt / 6;
      for (let k = 0; k < n; k++) state[k]! += sixth * (k1[k]! + 2 * (k2[k]! + k3[k]!) + k4[k]!);
    },
  };
}

/** Lets a model come to rest: `ms` of steps of `dt` ms without injected current. Returns its state. */
export function settle(model: Model, from_mv: number, ms: number, dt_ms = 0.01): Float64Array {
  const run = integrator(model, model.stateAt(from_mv));
  for (let k = 0; k < Math.round(ms / dt_ms); k++) run.step(dt_ms, 0, 0, 0);
  return Float64Array.from(run.state);
}
