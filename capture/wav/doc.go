// Package wav reads and writes WAV recordings.
//
// Reading is one walk over the chunks of a RIFF, RF64 or BW64 file and a bulk
// conversion of its samples into planar float64. What the walk believes, in
// this order: the bytes that are there, then the size of the data chunk (32
// bits, or 64 bits from ds64), never the outer size. Every size that lied is
// told by a flag, and every layout that is not read is refused by name: a
// recording read wrong without a word would put a false number on a ticket.
//
// Layout, from the published descriptions:
//
//   - chunks, fmt, LIST/INFO, left-justified odd widths: Multimedia
//     Programming Interface and Data Specifications 1.0 (August 1991)
//   - extensible fmt, sub-formats: ksmedia documentation of
//     WAVEFORMATEXTENSIBLE; codec numbers: RFC 2361
//   - RF64 and ds64: EBU Tech 3306; BW64: ITU-R BS.2088; bext: EBU Tech 3285
//
// (clauses from memory). Writing is ours too: the WAV library among the
// project's modules leaves out the pad byte after data of odd length, has no
// extensible header, and writes float samples one call at a time. It serves
// as the independent reader in the tests instead.
package wav
