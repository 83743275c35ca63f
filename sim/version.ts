/** The program's version; a test holds it to package.json, so that it is known in the browser too. */
export const VERSION = '0.1.0';
