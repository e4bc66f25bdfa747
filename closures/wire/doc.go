// Package wire holds the shapes that cross the edges of the service and their
// strict codecs: facts from outside, entries of the record, permits and problem
// documents, in JSON and in lines of JSON.
//
// It also holds the one grammar for numbers (ParseNumber), the one for times
// (ParseTime) and the one strict reader of JSON into structs (Strict), so that
// no two parts of the service read the same text differently.
//
// Three forms of a fact must not be mixed up. ParseFact reads what outsiders
// write: degrees, checked ranges, refused with a field, a cause and a mend.
// EncodeBody writes what the record keeps: radians and vectors to the last bit,
// so that a replay decides the same. A Permit is what leaves again: degrees and
// seconds, and a signed payload that alone is to be believed.
//
// The package is pure: it reads no clock and does no input or output, so the
// instant of reception and the signing are given to it. It keeps no state but
// that of a Parser, which has one owner. It fails closed: what it cannot read
// it refuses, and with an error it returns nothing that could be used.
package wire
