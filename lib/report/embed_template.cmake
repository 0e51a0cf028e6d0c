# Makes report.mustache a string inside the library, so that the program needs no data files where it is installed.
set(template ${CMAKE_CURRENT_LIST_DIR}/report.mustache)
set_property(DIRECTORY APPEND PROPERTY CMAKE_CONFIGURE_DEPENDS ${template})
file(READ ${template} EVENFIELD_REPORT_TEMPLATE)
configure_file(${CMAKE_CURRENT_LIST_DIR}/html_template.cpp.in ${CMAKE_CURRENT_BINARY_DIR}/html_template.cpp @ONLY)
target_sources(evenfield_report PRIVATE ${CMAKE_CURRENT_BINARY_DIR}/html_template.cpp)
