// Package formfile reads and writes form.json, the complete record of a found
// shape: what was asked, what was found, with which forces, and how far an
// independent audit believes it. Whatever checks or exports a shape needs this
// file and nothing else: positions, forces, stresses and reactions read back to
// the same bits.
//
// The file is one JSON object (RFC 8259) in UTF-8. Its head comes first, so
// that a program can look at the audit without reading a million nodes; each
// node, member and triangle then has a line of its own. Units are SI (m, N, N/m,
// N/m², rad), z is up, tension is positive, and ids count from 0 in the order of
// the list. Numbers are the shortest decimal text that reads back to the same
// 64-bit value; NaN and infinities do not occur, null stands for "not given" or
// "not known". [Schema] returns the JSON Schema of the format.
//
// Top keys, in the order they are written:
//
//	format      "anticlast-form/1"; a file of another number is refused
//	caution     the sentence every output carries
//	program     name, version, engines used
//	model       title, file, digest, limits, factors
//	units       the units of every quantity in words
//	counts      number of nodes, members, triangles
//	form        converged, why (not), steps taken
//	quantities  areas, spreads of achieved prestress, cables, lines, lengths by kind
//	audit       trusted, reasons, and every number behind them
//	findings    remarks with the places they are about
//	fabrics     name, elastic, moduli, strength, weight, pressure
//	air         volumes given: name, fabrics around it, sides (1 where the
//	            positive side of a fabric looks out), base (a node of the plane of
//	            the boundary), volume asked for and enclosed, pressure found
//	nodes       id, name, position, fixed, load, reaction [held, master, reference]
//	members     id, name, kind, group, nodes, length, unstressed_length, force,
//	            force_density, specified, stiffness, weight, resistance, law
//	            [strength, cable, unstressed_derived]
//	triangles   id, fabric, nodes, area, warp, stress, principal, specified,
//	            moduli, resistance [warp_wanted]
//	cables      ordered chains of members, with the law of their common force
//	rings       rings of high and low points
//	lines       fixed edges, arches and seams as lists of nodes
//	loads       self_weight, total of the dead loads on nodes
//
// Keys in brackets are written only where they say something. Keys that repeat
// what others determine (length, force_density, area, principal, moduli,
// resistance, total, units, counts) are written for the convenience of readers
// and ignored by [Read]; so are unknown keys, so that later versions may add
// some.
package formfile
