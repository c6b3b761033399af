/** What charts do with scripts. */
export {};
