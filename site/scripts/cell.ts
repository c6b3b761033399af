/** What the page of one cell does with scripts. */
export {};
