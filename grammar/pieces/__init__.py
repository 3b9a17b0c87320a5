"""Parts that single layouts, or a few of them, are made of; nothing else imports them.

| for the layouts | modules |
|---|---|
| atomblocks, slashes: counted tables | headings, tables, tabled, miscounts, channels, gathering |
| slashes alone | slashed |
| sets | setheadings, pseudopotentials |
| matrix | matrices |
| matrix, dollar: core potentials | cores |
| deck | plainlines, charged |
| commas | statements, statedcores |
| datagroup | groups, rownumbers, titled |
| gto-section | brackets |
| datagroup, gto-section, schema: a basis for each atom | centres |
| schema | jsontext, leaves, apart, jsonwriting |
"""
