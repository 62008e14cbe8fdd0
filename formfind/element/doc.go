// Package element is the mechanics of single elements: cables and struts,
// fabric triangles, pressure facets. All functions are pure: geometry in,
// nodal forces and tangent out. Nothing of a structure is known here.
//
// # Signs and layout
//
// Tension is positive. A pull is the force of an element on its node, in N; a
// node is in equilibrium when the sum of the pulls and the load on it is zero.
// A tangent is minus the derivative of the pulls by the positions, so that it
// is the second derivative of the element's energy where there is one, and
// positive when moving a node is resisted. Lengths are in m, membrane stress
// in N per m of width, pressure in N/m².
//
// A triangle's nodes are counter-clockwise seen from its positive side; edge i
// is opposite node i and runs counter-clockwise: e₀ = x₂ − x₁, e₁ = x₀ − x₂,
// e₂ = x₁ − x₀.
//
// # Accuracy
//
// Everything is written in differences of positions and unit vectors, never as
// products of positions with stiffness coefficients, so that slivers and
// coordinates far from the origin lose only what is lost in the differences.
// Degenerate elements (no length, no area, numbers that are not finite) are
// reported by a false second result instead of spreading NaN.
package element
