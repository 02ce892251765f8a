"""The public kernel test kit, with samples in the language of our cells."""

import unittest

import jupyter_kernel_test


class Kit(jupyter_kernel_test.KernelTests):
    kernel_name = "brinkline"
    language_name = "go"
    file_extension = ".go"
    code_hello_world = 'fmt.Println("hello, world")'
    code_stderr = 'import "os"\nfmt.Fprintln(os.Stderr, "oops")'
    completion_samples = [
        {"text": "strings.ToUpperS", "matches": {"ToUpperSpecial"}},
        {"text": "math.Cb", "matches": {"Cbrt"}},
    ]
    complete_code_samples = ["x := 1", "1 + 2", "func f() {\n}\n", 'import "os"']
    incomplete_code_samples = ["func f() {", "for i := range 3 {", "fmt.Println(", "x := `a"]
    invalid_code_samples = ["x := )", "func }"]
    code_page_something = "math.Sqrt?"
    code_generate_error = "panic(1)"
    code_execute_result = [
        {"code": "6 * 7", "result": "42"},
        {"code": "math.Sqrt(16)", "result": "4"},
        {"code": "1 < 2", "result": "true"},
    ]
    code_display_data = [{"code": "display.Show(1, 2)", "mime": "text/plain"}]
    code_history_pattern = "6?*"
    supported_history_operations = ("tail", "range", "search")
    code_inspect_sample = "math.Sqrt"


if __name__ == "__main__":
    unittest.main()
