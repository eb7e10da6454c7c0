// Package parafac resolves the fluorescing components of a survey that nobody
// gave us, and judges how many there are.
//
// The model of sample i at excitation j and emission k is
//
//	x_ijk = Σ_f a_if · b_jf · c_kf + e_ijk
//
// with scores a, excitation loadings b and emission loadings c (Harshman 1970;
// Carroll & Chang 1970; Bro 1997, Chemom. Intell. Lab. Syst. 38, 149). Missing
// cells take no part. The loss that a fit lowers is
//
//	‖W(X − model)‖² + ε Σ_f ‖a_f‖²‖b_f‖²‖c_f‖²,  ε = 3e-5,
//
// whose second term is every component's energy over the whole grid. It decides
// loadings that the mask leaves open, and only those: it is taken away from all
// others before the end.
//
// Inside the package a is I × F, b is J × F and c is K × F, row-major, with b
// and c at unit norm; a Result has loadings of maximum 1 and scores in the unit
// of the cube.
package parafac
