/**
 * A cell that a spreadsheet would take for a formula gets an apostrophe in front, so that a file's name can't become a
 * command in the program that opens the table. A number with a sign is none.
 */
function neutral(cell: string): string {
  return /^[=+\-@\t\r]/.test(cell) && !/^[+-]?\d+([.,]\d+)?$/.test(cell) ? `'${cell}` : cell;
}

function quoted(cell: string): string {
  return /[",\r\n]/.test(cell) ? `"${cell.replaceAll('"', '""')}"` : cell;
}

/** A table after RFC 4180: CRLF, quotes where needed. */
export function csv(rows: readonly (readonly string[])[]): string {
  return rows.map((row) => `${row.map((cell) => quoted(neutral(cell))).join(',')}\r\n`).join('');
}
