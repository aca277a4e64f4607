import { McapRecordBuilder } from '@mcap/core';
import { CHANNELS } from './channels.js';

/** MCAP's `library` field. */
export const LIBRARY = 'lapwing';
/** MCAP's `profile` field: none of the registered ones. */
export const PROFILE = '';

/** What a record file begins with: magic and header. */
export function openingBytes(): Uint8Array {
  const builder = new McapRecordBuilder();
  builder.writeMagic();
  builder.writeHeader({ profile: PROFILE, library: LIBRARY });
  return builder.buffer;
}

/** Every schema and channel; written into the first chunk of each file, so that its CRC covers them. */
export function schemaRecords(): Uint8Array {
  const builder = new McapRecordBuilder();
  for (const channel of CHANNELS) {
    builder.writeSchema({
      id: channel.id,
      name: channel.schemaName,
      encoding: channel.schemaEncoding,
      data: channel.schema(),
    });
    builder.writeChannel({
      id: channel.id,
      schemaId: channel.id,
      topic: channel.topic,
      messageEncoding: channel.messageEncoding,
      metadata: new Map(channel.metadata),
    });
  }
  return builder.buffer;
}

/** What a live file ends with: data end, a footer that points to no summary, magic. */
export function closingBytes(): Uint8Array {
  const builder = new McapRecordBuilder();
  builder.writeDataEnd({ dataSectionCrc: 0 });
  builder.writeFooter({ summaryStart: 0n, summaryOffsetStart: 0n, summaryCrc: 0 });
  builder.writeMagic();
  return builder.buffer;
}
