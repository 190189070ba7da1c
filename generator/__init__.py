"""Generator of the solvent datasheet handbook: tables in, checked and worked-out pages out."""
