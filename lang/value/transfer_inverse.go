package value

import "gainwright/lang/diag"

// largestTransferInverse bounds the elimination over rational functions.
const largestTransferInverse = 8

// invertTransfer gives t⁻¹ of a square matrix of rational functions by elimination.
func invertTransfer(t *Transfer) (*Transfer, error) {
	p, m := t.Dims()
	if p != m {
		return nil, diag.New(diag.Shape, "only a square transfer function has an inverse; this one is %s", sizeText(p, m))
	}
	if p > largestTransferInverse {
		return nil, diag.New(diag.Limit, "the inverse of a transfer function is limited to %s", sizeText(largestTransferInverse, largestTransferInverse))
	}
	rows := newEntries(p, 2*p)
	for i := range p {
		copy(rows[i], t.Entries[i])
		for j := range p {
			rows[i][p+j] = constantRatio(t.Variable, Int(0))
		}
		rows[i][p+i] = constantRatio(t.Variable, Int(1))
	}
	for k := range p {
		pivot := k
		for pivot < p && rows[pivot][k].Num.IsZero() {
			pivot++
		}
		if pivot == p {
			return nil, diag.New(diag.Numerical, "this transfer function is singular for every %s and has no inverse", t.Variable)
		}
		rows[k], rows[pivot] = rows[pivot], rows[k]
		if err := eliminateRatios(rows, k); err != nil {
			return nil, err
		}
	}
	out := &Transfer{Variable: t.Variable, Every: t.Every, Entries: newEntries(p, p), Inputs: t.Outputs, Outputs: t.Inputs}
	for i := range p {
		copy(out.Entries[i], rows[i][p:])
	}
	return out, nil
}

// eliminateRatios makes column k a unit vector.
func eliminateRatios(rows [][]Ratio, k int) error {
	inverse, err := invertRatio(rows[k][k])
	if err != nil {
		return err
	}
	for j := range rows[k] {
		if rows[k][j], err = multiplyRatios(rows[k][j], inverse); err != nil {
			return err
		}
	}
	for i := range rows {
		factor := rows[i][k]
		if i == k || factor.Num.IsZero() {
			continue
		}
		factor.Num = negatePolynomial(factor.Num)
		for j := range rows[i] {
			term, err := multiplyRatios(factor, rows[k][j])
			if err != nil {
				return err
			}
			if rows[i][j], err = addRatios(rows[i][j], term); err != nil {
				return err
			}
		}
	}
	return nil
}

func powerTransfer(t *Transfer, k int) (*Transfer, error) {
	p, m := t.Dims()
	if p != m {
		return nil, diag.New(diag.Shape, "only a square transfer function has powers; this one is %s", sizeText(p, m))
	}
	if k < 0 {
		inverse, err := invertTransfer(t)
		if err != nil {
			return nil, err
		}
		t, k = inverse, -k
	}
	if k < 0 || k > LargestDegree {
		return nil, degreeLimit()
	}
	out := staticTransfer(IdentityMatrix(p), t)
	for range k {
		var err error
		if out, err = multiplyTransfers(out, t); err != nil {
			return nil, err
		}
	}
	out.Inputs, out.Outputs = t.Inputs, t.Outputs
	return out, nil
}
