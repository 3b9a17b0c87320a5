"""Parts that single layouts, or a few of them, are made of; nothing else imports them.

| for the layouts | modules |
|---|---|
| atomblocks, slashes: counted tables | headings, tables, tabled, miscounts, channels, gathering |
| slashes alone | slashed |
| sets | setheadings, setlines, pseudopotentials |
| matrix | matrices |
| matrix, dollar: core potentials | cores |
| deck | plainlines, fives, charged |
| commas | statements, soundstatements, contractions, statedcores |
| datagroup | groups, atoms, numbered, rownumbers, titled |
| gto-section | brackets, atomlists, bracketwriting |
| datagroup, gto-section, schema: a basis for each atom | centres |
| schema | jsontokens, jsontext, leaves, apart, atonce, centrewise, jsonwriting |
| stars, at-blocks, keyworded, deck, datagroup: slips in headings | slips |
"""
