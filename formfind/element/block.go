package element

import "gonum.org/v1/gonum/spatial/r3"

// Block is a 3×3 matrix between two nodes, row by row.
type Block [9]float64

// Mul returns b·v.
func (b *Block) Mul(v r3.Vec) r3.Vec {
	return r3.Vec{
		X: b[0]*v.X + b[1]*v.Y + b[2]*v.Z,
		Y: b[3]*v.X + b[4]*v.Y + b[5]*v.Z,
		Z: b[6]*v.X + b[7]*v.Y + b[8]*v.Z,
	}
}

// Add adds c to b in place.
func (b *Block) Add(c *Block) {
	for i := range b {
		b[i] += c[i]
	}
}

// Scale multiplies b by f in place.
func (b *Block) Scale(f float64) {
	for i := range b {
		b[i] *= f
	}
}

// Transpose returns bᵀ.
func (b *Block) Transpose() Block {
	return Block{b[0], b[3], b[6], b[1], b[4], b[7], b[2], b[5], b[8]}
}

// Outer returns f·a·bᵀ.
func Outer(f float64, a, b r3.Vec) Block {
	return Block{
		f * a.X * b.X, f * a.X * b.Y, f * a.X * b.Z,
		f * a.Y * b.X, f * a.Y * b.Y, f * a.Y * b.Z,
		f * a.Z * b.X, f * a.Z * b.Y, f * a.Z * b.Z,
	}
}

// Skew returns the matrix f·[v]ₓ, so that Skew(f, v)·w = f·(v × w).
func Skew(f float64, v r3.Vec) Block {
	return Block{
		0, -f * v.Z, f * v.Y,
		f * v.Z, 0, -f * v.X,
		-f * v.Y, f * v.X, 0,
	}
}
