/** What a person may type as a note, and every export must give back as it was. */
export const HARD_TEXT = ' said "so", and\nso;\r\n5 µm, 日本語, \'x\', a\\b, "" ';
