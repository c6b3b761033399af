/** An error that a user can do something about: printed as it stands, without a stack. */
export class UserError extends Error {
  /** 1: could not; 2: wrong usage. */
  readonly status: 1 | 2;
  constructor(message: string, status: 1 | 2 = 1) {
    super(message);
    this.name = 'UserError';
    this.status = status;
  }
}
