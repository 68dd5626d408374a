// Package trial holds tests of the whole program under damage: runs that are
// killed, stores that are spoiled, disks that are full or may not be written
// to, several runs at once. It has no code of its own.
//
// Each trial has the same question: does a run that is left in peace afterwards
// come to the results of one that was never disturbed, and does it compute only
// what was not finished? A [tree] is what is compared.
package trial
